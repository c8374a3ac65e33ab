"""The demonstration laboratory, made through the procedures."""
