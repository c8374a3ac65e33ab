"""Outliers and tests of a variance (ISO 5725-2, 7.3.4; common F and χ² tests)."""

import math
from collections.abc import Sequence
from dataclasses import dataclass

LEVEL = 0.95


@dataclass(frozen=True, slots=True)
class Grubbs:
    """Grubbs' statistic of the value farthest from the mean, with its critical values.

    ``critical_5`` and ``critical_1`` are the two-sided ones at 5 % (straggler) and 1 % (outlier).
    """

    which: int
    G: float
    critical_5: float
    critical_1: float


def grubbs(values: Sequence[float]) -> Grubbs:
    """Return Grubbs' test for one outlying value, on either side.

    Raises:
        ValueError: fewer than three values, or all alike.
    """
    n = len(values)
    mean = math.fsum(values) / n
    s = math.sqrt(math.fsum((one - mean) ** 2 for one in values) / max(1, n - 1))
    if n < 3 or s == 0:
        raise ValueError("Grubbs' test needs three values that are not all alike")
    which = max(range(n), key=lambda i: abs(values[i] - mean))
    G = abs(values[which] - mean) / s
    return Grubbs(which, G, critical_grubbs(n, 0.05), critical_grubbs(n, 0.01))


def critical_grubbs(n: int, level: float, *, sides: int = 2) -> float:
    """Return Grubbs' critical value for n values at a significance level.

    G = (n − 1)/√n·√(t²/(n − 2 + t²)), t at 1 − α/(sides·n) with n − 2 degrees of freedom. ISO
    5725-2 tabulates the two-sided values.
    """
    from scipy.special import stdtrit  # noqa: PLC0415 - half of a bare start-up

    t = float(stdtrit(n - 2, 1.0 - level / (sides * n)))
    return (n - 1) / math.sqrt(n) * math.sqrt(t**2 / (n - 2 + t**2))


def f_limit(dof: float, reference_dof: float | None, *, level: float = LEVEL) -> float:
    """Return F(level; ν, ν_reference); a reference with infinite ν gives χ²/ν."""
    from scipy.special import fdtri  # noqa: PLC0415 - half of a bare start-up

    if reference_dof is None:
        return chi2_limit(dof, level=level) / dof
    return float(fdtri(dof, reference_dof, level))


def chi2_limit(dof: float, *, level: float = LEVEL) -> float:
    """Return the quantile of χ² with ``dof`` degrees of freedom."""
    from scipy.special import chdtri  # noqa: PLC0415 - half of a bare start-up

    return float(chdtri(dof, 1.0 - level))
