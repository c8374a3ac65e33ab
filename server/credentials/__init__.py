"""Passwords and tokens."""
