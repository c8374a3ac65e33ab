"""Atomic weights, substances, reactions, equilibria and cautions, each value with its source."""
