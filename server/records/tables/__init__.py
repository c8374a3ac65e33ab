"""The tables, one module a noun."""
