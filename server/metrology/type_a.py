"""Type A evaluation: mean and experimental standard deviation of readings (JCGM 100, 4.2)."""

import math
from collections.abc import Sequence


def mean_of(values: Sequence[float]) -> float:
    """Return the arithmetic mean of at least one value."""
    return math.fsum(values) / len(values)


def standard_deviation(values: Sequence[float]) -> float | None:
    """Return s with n − 1 in its denominator, None for fewer than two values."""
    if len(values) < 2:
        return None
    mean = mean_of(values)
    return math.sqrt(math.fsum((one - mean) ** 2 for one in values) / (len(values) - 1))


def pooled(groups: Sequence[Sequence[float]]) -> tuple[float, int] | None:
    """Return the pooled s of several groups and its degrees of freedom, None where there are none.

    s_p² = Σ (n_i − 1)·s_i² / Σ (n_i − 1).
    """
    squares, dof = 0.0, 0
    for values in groups:
        s = standard_deviation(values)
        if s is not None:
            squares += (len(values) - 1) * s**2
            dof += len(values) - 1
    return (math.sqrt(squares / dof), dof) if dof else None
