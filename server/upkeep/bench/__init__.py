"""Measurements of speed and error against yardsticks that run in the same minute."""
