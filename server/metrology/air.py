"""Density of moist air."""

from typing import Any

import numpy as np

_R = 8.314472  # J/(mol K), the value with which CIPM-2007 was published
_MOLAR_MASS_AIR = 28.96546e-3  # kg/mol at 0.0004 carbon dioxide
_MOLAR_MASS_WATER = 18.01528e-3  # kg/mol
#: Relative standard uncertainty of the equation itself.
CIPM_2007_RELATIVE_U = 2.2e-5


def cipm_2007(temperature: Any, pressure: Any, humidity: Any) -> Any:
    """Return the density of moist air in kg/m³ by CIPM-2007.

    ``temperature`` in °C, ``pressure`` in hPa, ``humidity`` relative in percent; a mole fraction of
    carbon dioxide of 0.0004. Picard, Davis, Gläser, Fujii, Metrologia 45 (2008) 149-155.
    """
    t, p, h = temperature, pressure * 100.0, humidity / 100.0
    kelvin = t + 273.15
    saturation = np.exp(
        1.2378847e-5 * kelvin**2 - 1.9121316e-2 * kelvin + 33.93711047 - 6.3431645e3 / kelvin
    )
    enhancement = 1.00062 + 3.14e-8 * p + 5.6e-7 * t**2
    x = h * enhancement * saturation / p
    compressibility = (
        1.0
        - p
        / kelvin
        * (
            1.58123e-6
            - 2.9331e-8 * t
            + 1.1043e-10 * t**2
            + (5.707e-6 - 2.051e-8 * t) * x
            + (1.9898e-4 - 2.376e-6 * t) * x**2
        )
        + (p / kelvin) ** 2 * (1.83e-11 - 0.765e-8 * x**2)
    )
    dry = p * _MOLAR_MASS_AIR / (compressibility * _R * kelvin)
    return dry * (1.0 - x * (1.0 - _MOLAR_MASS_WATER / _MOLAR_MASS_AIR))


def iso_tr_20461(temperature: Any, pressure: Any, humidity: Any) -> Any:
    """Return the density of moist air in kg/m³ by the short form of ISO/TR 20461.

    ``temperature`` in °C, ``pressure`` in hPa, ``humidity`` relative in percent. The form in which
    the factors Z of ISO 8655-6 are tabulated.
    """
    vapour = humidity * (0.00252 * temperature - 0.020582)
    return (0.34844 * pressure - vapour) / (temperature + 273.15)
