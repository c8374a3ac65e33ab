"""The glass electrode: Nernst slope, and a probe's slope and offset from readings in buffers."""

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from server.metrology.propagation import Input, propagate

_R, _F = 8.314462618, 96485.33212  # J/(mol K), C/mol: CODATA 2018, exact by the SI
_ZERO_C = 273.15
#: A glass electrode gives 0 mV at about this pH; offsets are stated there.
NEUTRAL_PH = 7.0


@dataclass(frozen=True, slots=True)
class BufferReading:
    """A probe in a buffer: its pH with u, °C, and what the meter shows.

    ``mV`` is the potential; ``shown_pH`` instead, where the meter shows pH by the theoretical slope
    and 0 mV at pH 7.
    """

    pH: float
    u_pH: float
    temperature_C: float
    mV: float | None = None
    shown_pH: float | None = None


@dataclass(frozen=True, slots=True)
class ProbeFit:
    """Slope in percent of Nernst and offset in mV at pH 7, each with u; ``residuals_mV`` in order.

    ``dof`` is the number of buffers less two. Where the buffers disagree more than their
    uncertainties allow, u is that of the disagreement.
    """

    slope_percent: float
    u_slope_percent: float
    offset_mV: float
    u_offset_mV: float
    residuals_mV: tuple[float, ...]
    dof: int


def nernst_slope_mV(temperature_C: Any) -> Any:
    """Return R·T·ln 10/F in mV per unit of pH at a temperature in °C."""
    return 1000.0 * _R * (temperature_C + _ZERO_C) * math.log(10.0) / _F


def fit_probe(
    readings: Sequence[BufferReading], *, u_mV: float = 0.0, u_temperature_C: float = 0.0
) -> ProbeFit:
    """Return slope and offset of E = offset − slope·k(T)·(pH − 7) by least squares.

    Every buffer has its own temperature T; ``u_mV`` is that of each reading, ``u_temperature_C``
    that of the thermometer, one and the same in all buffers.

    Raises:
        ValueError: fewer than two buffers, two of one pH, or a reading that says nothing.
    """
    if len(readings) < 2:
        says = "A probe's slope needs at least two buffers."
        raise ValueError(says)
    pHs = [one.pH for one in readings]
    if max(pHs) - min(pHs) < 1.0:
        says = "The buffers lie too close together: at least one unit of pH apart."
        raise ValueError(says)
    inputs = _inputs(readings, u_mV, u_temperature_C)
    slope = propagate(lambda x: _solve(readings, x)[0], inputs)
    offset = propagate(lambda x: _solve(readings, x)[1], inputs)
    residuals = tuple(
        _potential(one, {}, i) - offset.value - slope.value * _theory(one, {}, i)
        for i, one in enumerate(readings)
    )
    dof = len(readings) - 2
    spread = _spread(readings, residuals, dof)
    return ProbeFit(
        slope_percent=100.0 * slope.value,
        u_slope_percent=100.0 * max(slope.u, spread[0]),
        offset_mV=offset.value,
        u_offset_mV=max(offset.u, spread[1]),
        residuals_mV=residuals,
        dof=dof,
    )


def _inputs(readings: Sequence[BufferReading], u_mV: float, u_temperature_C: float) -> list[Input]:
    found = [Input(name="temperature", value=0.0, u=u_temperature_C)]
    for i, one in enumerate(readings):
        found.append(Input(name=f"pH {i}", value=0.0, u=one.u_pH))
        found.append(Input(name=f"reading {i}", value=0.0, u=u_mV))
    return [one for one in found if one.u > 0]


def _potential(one: BufferReading, x: Mapping[str, Any], i: int) -> Any:
    error = x.get(f"reading {i}", 0.0)
    if one.mV is not None:
        return one.mV + error
    if one.shown_pH is None:
        says = "A buffer needs what the meter shows, in mV or in pH."
        raise ValueError(says)
    # the meter turned its potential into pH by the theoretical slope at the buffer's temperature
    return -nernst_slope_mV(one.temperature_C) * (one.shown_pH - NEUTRAL_PH) + error


def _theory(one: BufferReading, x: Mapping[str, Any], i: int) -> Any:
    """Return what a perfect probe would show in mV."""
    t = one.temperature_C + x.get("temperature", 0.0)
    return -nernst_slope_mV(t) * (one.pH + x.get(f"pH {i}", 0.0) - NEUTRAL_PH)


def _solve(readings: Sequence[BufferReading], x: Mapping[str, Any]) -> tuple[Any, Any]:
    """Return slope (1 is perfect) and offset in mV of the least-squares line E against theory."""
    n = len(readings)
    theory = [_theory(one, x, i) for i, one in enumerate(readings)]
    shown = [_potential(one, x, i) for i, one in enumerate(readings)]
    mean_theory, mean_shown = sum(theory) / n, sum(shown) / n
    across = sum((a - mean_theory) * (b - mean_shown) for a, b in zip(theory, shown, strict=True))
    slope = across / sum((a - mean_theory) ** 2 for a in theory)
    return slope, mean_shown - slope * mean_theory


def _spread(
    readings: Sequence[BufferReading], residuals: Sequence[float], dof: int
) -> tuple[float, float]:
    """Return u of slope and offset from the residuals' own spread, 0 without degrees of freedom."""
    if dof < 1:
        return 0.0, 0.0
    theory = [_theory(one, {}, i) for i, one in enumerate(readings)]
    mean = sum(theory) / len(theory)
    squares = sum((one - mean) ** 2 for one in theory)
    s2 = sum(one**2 for one in residuals) / dof
    return math.sqrt(s2 / squares), math.sqrt(s2 * (1.0 / len(theory) + mean**2 / squares))
