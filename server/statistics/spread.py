"""Mean and spread of replicates (JCGM 100, 4.2)."""

import math
from collections.abc import Sequence
from dataclasses import dataclass

from server.metrology.coverage import coverage_factor


@dataclass(frozen=True, slots=True)
class Summary:
    """n, mean, experimental standard deviation s, relative s in percent, the mean's 95 % interval.

    ``s``, ``rsd_percent`` and ``ci95`` are None for one value.
    """

    n: int
    mean: float
    s: float | None
    rsd_percent: float | None
    ci95: tuple[float, float] | None


def summarize(values: Sequence[float]) -> Summary:
    """Return the summary of at least one value; the interval is mean ± t(0.975, n − 1)·s/√n."""
    n = len(values)
    mean = math.fsum(values) / n
    if n == 1:
        return Summary(1, mean, None, None, None)
    s = math.sqrt(math.fsum((one - mean) ** 2 for one in values) / (n - 1))
    half = coverage_factor(float(n - 1), 0.95) * s / math.sqrt(n)
    rsd = 100.0 * s / abs(mean) if mean else None
    return Summary(n, mean, s, rsd, (mean - half, mean + half))
