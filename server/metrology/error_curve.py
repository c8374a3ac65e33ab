"""Curves of errors: what lies between their points."""

from collections.abc import Sequence


def bend_between(table: Sequence[tuple[float, float]]) -> float:
    """Return by how much a table may miss what lies straight between two of its points.

    A smooth curve through evenly spaced points lies a quarter as far from the chord of two
    neighbours as a point lies from the chord of the points on both sides of it. The scatter of the
    points counts as bend, so that this is a bound, not an estimate.
    """
    apart = 0.0
    for (a, before), (at, value), (b, after) in zip(table, table[1:], table[2:], strict=False):
        chord = before + (after - before) * (at - a) / (b - a)
        apart = max(apart, abs(value - chord))
    return apart / 4.0
