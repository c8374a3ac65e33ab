"""Bytes and typed lines to values."""
