"""Outliers, spread, comparison of methods, series over time."""
