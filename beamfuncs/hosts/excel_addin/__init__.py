"""The Excel add-in: its VBA module, its settings, its installation and its diagnosis."""
