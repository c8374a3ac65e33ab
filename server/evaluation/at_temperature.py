"""A certified concentration at the temperature of use."""

import math
from collections.abc import Mapping
from typing import Any

from server.metrology.quantity import Quantity
from server.metrology.rounding import report
from server.metrology.water import density

REFERENCE_C = 20.0
LOW_C, HIGH_C = 0.0, 40.0
#: How well the temperature of the liquid is taken as known: a rectangular bound, in °C.
HALF_WIDTH_C = 0.5
_STEP_C = 0.01


def concentration_at(
    concentration: Mapping[str, Any], temperature_C: float, *, expansion: Quantity | None
) -> dict[str, Any]:
    """Return a bench result's concentration (mol/L at 20 °C) in the liquid at another temperature.

    c(t) = c20 · ρ(t)/ρ(20) with the density of water, or c20 · (1 − β·(t − 20)) where the
    expansion β of the liquid is stated (1/K). To u come ± 0.5 °C of temperature, rectangular, and
    u(β), first order; k stays the certificate's, so that U never falls below it. Keys as in a
    bench result's ``concentration``, with ``temperature_C`` and ``says``.

    Raises:
        ValueError: the temperature is outside 0 to 40 °C.
    """
    if not LOW_C <= temperature_C <= HIGH_C:
        raise ValueError("the temperature must be from 0 to 40 °C")
    c20, k, unit = float(concentration["value"]), float(concentration["k"]), concentration["unit"]
    factor, slope = _factor(temperature_C, expansion)
    parts = (
        float(concentration["u"]) * factor,
        c20 * slope * HALF_WIDTH_C / math.sqrt(3.0),
        c20 * (temperature_C - REFERENCE_C) * (expansion.u if expansion else 0.0),
    )
    value, u = c20 * factor, math.hypot(*parts)
    by = "the stated expansion of the liquid" if expansion else "the density of water"
    return {
        "temperature_C": temperature_C,
        "value": value,
        "u": u,
        "U": k * u,
        "k": k,
        "coverage": concentration["coverage"],
        "unit": unit,
        "reported": report(value, k * u, unit, k),
        "says": f"Of the liquid at this temperature, by {by}; the temperature is taken as known "
        f"to ± {HALF_WIDTH_C} °C.",
    }


def _factor(temperature_C: float, expansion: Quantity | None) -> tuple[float, float]:
    """Return c(t)/c20 and its slope per °C."""
    if expansion is not None:
        beta = expansion.value or 0.0
        return 1.0 - beta * (temperature_C - REFERENCE_C), -beta
    at_20 = float(density(REFERENCE_C))
    low, high = max(LOW_C, temperature_C - _STEP_C), min(HIGH_C, temperature_C + _STEP_C)
    slope = (float(density(high)) - float(density(low))) / (high - low) / at_20
    return float(density(temperature_C)) / at_20, slope
