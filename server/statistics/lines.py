"""Straight lines by weighted least squares, with prediction and crossing of zero."""

from collections.abc import Sequence
from dataclasses import dataclass
from math import fsum, inf, sqrt


class LineProblem(ValueError):
    """Points through which no line can be laid; the words say why."""


@dataclass(frozen=True, slots=True)
class Line:
    """y = intercept + slope x, with standard uncertainties and what prediction needs.

    ``s`` is the standard deviation about the line (of unit weight), ``dof`` its degrees of freedom,
    ``r2`` the share of the weighted variance that the line explains. With known weights the
    uncertainties come from the weights alone and ``s`` is what it should be 1 against.
    """

    intercept: float
    slope: float
    u_intercept: float
    u_slope: float
    s: float
    dof: int
    r2: float
    middle: float
    weight: float
    spread: float
    scale: float

    def at(self, x: float) -> float:
        """Return the line's height."""
        return self.intercept + self.slope * x

    def u_at(self, x: float) -> float:
        """Return the standard uncertainty of the line's height."""
        away = (x - self.middle) ** 2 / self.spread
        return self.scale * sqrt(1 / self.weight + away)

    def u_new(self, x: float, *, weight: float = 1.0) -> float:
        """Return the standard uncertainty of one new value at x, of a given weight."""
        return sqrt(self.u_at(x) ** 2 + self.scale**2 / weight)

    def crossing(self) -> tuple[float, float]:
        """Return where the line is zero, with its standard uncertainty (first order).

        Raises:
            LineProblem: the line is level.
        """
        if self.slope == 0:
            raise LineProblem("The line is level: it crosses zero nowhere.")
        x = -self.intercept / self.slope
        return x, self.u_at(x) / abs(self.slope)


def weighted_line(
    x: Sequence[float],
    y: Sequence[float],
    weights: Sequence[float] | None = None,
    *,
    known: bool = False,
) -> Line:
    """Return the least-squares line; ``weights`` are one over each y's variance, or relative.

    With ``known`` the weights are taken as one over the true variances; otherwise the scatter about
    the line sets the scale (Draper & Smith, Applied Regression Analysis, ch. 1 and 9).

    Raises:
        LineProblem: fewer than two points (three where the scatter is to be learnt), unequal
            lengths, a weight that is not above zero, all x the same.
    """
    w = [1.0] * len(x) if weights is None else list(weights)
    if not len(x) == len(y) == len(w):
        raise LineProblem("x, y and weights must be equally many.")
    dof = len(x) - 2
    if dof < (0 if known else 1):
        raise LineProblem(f"A line needs at least {2 if known else 3} points.")
    if any(not 0 < one < inf for one in w):
        raise LineProblem("Every weight must be above zero.")
    total = fsum(w)
    middle = fsum(a * b for a, b in zip(w, x, strict=True)) / total
    height = fsum(a * b for a, b in zip(w, y, strict=True)) / total
    dx, dy = [one - middle for one in x], [one - height for one in y]
    spread = fsum(a * b * b for a, b in zip(w, dx, strict=True))
    if spread <= 0:
        raise LineProblem("All x are the same: no line can be laid.")
    slope = fsum(a * b * c for a, b, c in zip(w, dx, dy, strict=True)) / spread
    left = fsum(a * (c - slope * b) ** 2 for a, b, c in zip(w, dx, dy, strict=True))
    whole = fsum(a * c * c for a, c in zip(w, dy, strict=True))
    s = sqrt(left / dof) if dof else 0.0
    scale = 1.0 if known else s
    return Line(
        intercept=height - slope * middle,
        slope=slope,
        u_intercept=scale * sqrt(1 / total + middle * middle / spread),
        u_slope=scale / sqrt(spread),
        s=s,
        dof=dof,
        r2=1 - left / whole if whole > 0 else 1.0,
        middle=middle,
        weight=total,
        spread=spread,
        scale=scale,
    )
