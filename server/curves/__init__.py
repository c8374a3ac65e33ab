"""From points of a titration curve to equivalence volumes."""
