"""A lot, whole, as one archive that can be read and checked without this program."""
