"""Propagation of distributions by Monte Carlo, and validation of first order (JCGM 101)."""

import math
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from server.metrology.propagation import Input
from server.metrology.rounding import rounding_exponent

Array = NDArray[np.float64]

#: Trials drawn at once: small enough for the processor's cache, so that memory stays flat.
CHUNK = 8192
#: Where this many do not settle two digits of u, the comparison is made at one digit.
MOST_TRIALS = 2_000_000
_LEAST_TRIALS = 10_000
_LEAST_DOF = 2.0


@dataclass(frozen=True, slots=True)
class Simulated:
    """What Monte Carlo gives: mean, u, the probabilistically symmetric interval, the verdict.

    ``u`` is None where an input with 2 degrees of freedom or fewer has none. ``delta`` is the
    numerical tolerance (JCGM 101, 7.9.2) at ``digits`` significant digits of u.
    """

    trials: int
    seed: int
    value: float
    u: float | None
    low: float
    high: float
    first_order_validated: bool
    digits: int
    delta: float


def simulate(
    function: Callable[[Mapping[str, Any]], Any],
    inputs: Sequence[Input],
    *,
    seed: int,
    coverage: float,
    trials: int | None,
    first_order: tuple[float, float],
    u: float,
) -> Simulated:
    """Return the output's distribution, and whether the first-order interval is validated.

    ``function`` takes arrays of trials by input name. An input with degrees of freedom is drawn
    from the scaled t, a half-width from its shape, anything else from the normal distribution;
    inputs of one root move together. Trials are raised until twice the standard error of each end
    point is below δ/5 (clause 8 with 7.9), δ for two digits of ``u``; where MOST_TRIALS do not
    reach that, δ is that of one digit. ``trials`` is the least number.
    """
    draw = _Draw(inputs, seed)
    values = np.empty(0)
    wanted = max(trials or 0, _LEAST_TRIALS)
    most = max(wanted, MOST_TRIALS)
    delta = numerical_tolerance(u, digits=2)
    while True:
        values = _extended(values, wanted, function, draw)
        values.sort()
        (low, low_error), (high, high_error) = _end_points(values, coverage)
        error = 2.0 * max(low_error, high_error)
        settled = error < delta / 5.0
        if settled or wanted >= most:
            break
        needed = 1.2 * wanted * (error / (delta / 5.0)) ** 2
        wanted = min(most, max(int(needed), wanted * 2))
    digits = 2 if settled else 1
    delta = numerical_tolerance(u, digits=digits)
    apart = max(abs(first_order[0] - low), abs(first_order[1] - high))
    return Simulated(
        trials=len(values),
        seed=seed,
        value=float(values.mean()),
        u=None if draw.undefined_u else float(values.std(ddof=1)),
        low=low,
        high=high,
        first_order_validated=bool(apart <= delta),
        digits=digits,
        delta=delta,
    )


def numerical_tolerance(u: float, *, digits: int) -> float:
    """Return δ = 10^l/2, where u = c·10^l with c of so many digits (JCGM 101, 7.9.2)."""
    return 0.5 * 10.0 ** rounding_exponent(u, digits=digits) if u > 0 else 0.0


class _Draw:
    """Draws chunks of trials; the inputs of one root share their random numbers."""

    def __init__(self, inputs: Sequence[Input], seed: int) -> None:
        self._random = np.random.Generator(np.random.SFC64(seed))
        self._roots: dict[str, list[Input]] = {}
        for i, one in enumerate(inputs):
            key = f"root {one.id}" if one.id is not None else f"input {i}"
            self._roots.setdefault(key, []).append(one)
        self.undefined_u = any(
            one.dof is not None and one.dof <= _LEAST_DOF and one.half_width is None
            for one in inputs
        )

    def chunk(self, size: int) -> dict[str, Array]:
        """Return so many trials of every input."""
        found = {}
        for members in self._roots.values():
            deviate = self._deviate(members, size)
            for one in members:
                found[one.name] = one.value + one.u * deviate
        return found

    def _deviate(self, members: Sequence[Input], size: int) -> Array:
        """Return standardized deviates: (x − value)/u of a root's first input with its shape."""
        first, random = members[0], self._random
        if first.half_width is not None and first.shape == "rectangular":
            return math.sqrt(3.0) * (2.0 * random.random(size) - 1.0)
        if first.half_width is not None and first.shape == "triangular":
            return math.sqrt(6.0) * (random.random(size) + random.random(size) - 1.0)
        if first.half_width is not None and first.shape == "arcsine":
            return math.sqrt(2.0) * np.sin(math.pi * (random.random(size) - 0.5))
        dofs = [one.dof for one in members if one.dof is not None]
        if dofs:
            return random.standard_t(min(dofs), size)
        return random.standard_normal(size)


def _extended(
    values: Array, wanted: int, function: Callable[[Mapping[str, Any]], Any], draw: _Draw
) -> Array:
    """Return the values with more trials behind them, drawn chunk by chunk."""
    extended = np.empty(wanted)
    extended[: len(values)] = values
    for start in range(len(values), wanted, CHUNK):
        stop = min(start + CHUNK, wanted)
        extended[start:stop] = function(draw.chunk(stop - start))
    return extended


def _end_points(values: Array, coverage: float) -> tuple[tuple[float, float], tuple[float, float]]:
    """Return the interval's end points, each with its standard error.

    The rank of a quantile is binomial: the values one standard deviation of rank away tell its
    error without any density.
    """
    tail = 0.5 * (1.0 - coverage)
    return _quantile(values, tail), _quantile(values, 1.0 - tail)


def _quantile(values: Array, probability: float) -> tuple[float, float]:
    n = len(values)
    rank = probability * (n - 1)
    spread = math.sqrt(n * probability * (1.0 - probability))
    below, above = max(0, int(rank - spread)), min(n - 1, math.ceil(rank + spread))
    lower = int(rank)
    part = rank - lower
    upper = min(lower + 1, n - 1)
    value = (1.0 - part) * values[lower] + part * values[upper]
    return float(value), 0.5 * float(values[above] - values[below])
