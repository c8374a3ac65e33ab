"""Volumetric ware: volumes at 20 °C, error tables, gravimetric volumes (ISO 4787, ISO 8655-6)."""

from bisect import bisect_right
from collections.abc import Sequence
from typing import Any

from server.metrology.buoyancy import WEIGHTS
from server.metrology.water import density

REFERENCE_TEMPERATURE_C = 20.0


def volume_factor(temperature: Any, glass_expansion: float, liquid_expansion: Any | None) -> Any:
    """Return F, by which a volume read at ``temperature`` becomes that of the liquid at 20 °C.

    F = ρ(t)/ρ(20)·(1 + γ(t − 20)) with the density of water where ``liquid_expansion`` is None,
    else 1 + (γ − β)(t − 20). Cubic expansions γ of the glass and β of the liquid per kelvin,
    ``temperature`` in °C.
    """
    above = temperature - REFERENCE_TEMPERATURE_C
    if liquid_expansion is not None:
        return 1.0 + (glass_expansion - liquid_expansion) * above
    return density(temperature) / density(REFERENCE_TEMPERATURE_C) * (1.0 + glass_expansion * above)


def interpolate_error(table: Sequence[tuple[float, float]], reading: float) -> float:
    """Return an instrument's error at a reading, linear between the table's points.

    Raises:
        ValueError: the reading lies outside the table.
    """
    if not table[0][0] <= reading <= table[-1][0]:
        says = f"{reading:g} lies outside the error table, {table[0][0]:g} to {table[-1][0]:g}"
        raise ValueError(says)
    i = min(bisect_right(table, reading, key=lambda row: row[0]), len(table) - 1)
    (x0, y0), (x1, y1) = table[i - 1], table[i]
    return y0 + (y1 - y0) * (reading - x0) / (x1 - x0)


def z_factor(water: float, air: float, *, weights: float = WEIGHTS) -> float:
    """Return Z in µL/mg (mL/g): the volume of water per reading of the balance (ISO 8655-6).

    Densities in kg/m³; the vessel's expansion is not in it.
    """
    return 1000.0 / (water - air) * (1.0 - air / weights)


def volume_at_20(
    reading_g: float, z: float, *, glass_expansion: float, temperature: float
) -> float:
    """Return V20 = m·Z·(1 − γ(t − 20)) in mL from a balance reading in g (ISO 4787).

    ``glass_expansion`` is γ per kelvin, ``temperature`` the water's in °C.
    """
    return reading_g * z * (1.0 - glass_expansion * (temperature - REFERENCE_TEMPERATURE_C))
