"""Worksheet functions that solve any line beam exactly."""
