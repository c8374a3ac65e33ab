"""Density and expansion of water."""

from typing import Any

_A1, _A2, _A3, _A4, _A5 = -3.983035, 301.797, 522528.9, 69.34881, 999.97495


def density(temperature: Any) -> Any:
    """Return the density of air-free water in kg/m³ at ``temperature`` in °C (0 to 40 °C).

    Tanaka, Girard, Davis, Peuto, Bignell, Metrologia 38 (2001) 301-309.
    """
    t = temperature
    return _A5 * (1.0 - (t + _A1) ** 2 * (t + _A2) / (_A3 * (t + _A4)))


def air_saturation_change(temperature: Any) -> Any:
    """Return what saturation with air adds to the density, in kg/m³ (negative; 0 to 25 °C).

    Tanaka et al. 2001; the two coefficients are from memory.
    """
    return -4.612e-3 + 1.06e-4 * temperature
