"""Labels of bottles: what stands on them, on which sheet, and their PDF and pictures."""
