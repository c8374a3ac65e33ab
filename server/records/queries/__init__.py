"""The selects, one module a noun."""
