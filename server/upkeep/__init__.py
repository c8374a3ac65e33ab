"""Backup, restore, move, trail check, bench."""
