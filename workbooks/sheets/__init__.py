"""The parts of a design workbook: its data, the look of its pages, and its sheets."""
