"""Acid-base constants by temperature, the ion product of water, Davies activity coefficients.

All constants are thermodynamic (activities, molal standard state, which for dilute water differs
from the molar one by less than 0.002 in pK near room temperature).
"""

from collections.abc import Callable
from dataclasses import dataclass
from math import exp, log10
from types import MappingProxyType

LOWEST_C, HIGHEST_C = 0.0, 50.0
_ZERO_C = 273.15

DAVIES_SLOPE = 0.3
"""Coefficient of the linear term of Davies' equation (Davies 1962; 0.2 in Davies 1938)."""


class TemperatureProblem(ValueError):
    """A temperature at which the constants kept here do not hold."""


def _kelvin(temperature_C: float) -> float:
    if not LOWEST_C <= temperature_C <= HIGHEST_C:
        says = (
            f"The acid-base constants hold from {LOWEST_C:g} to {HIGHEST_C:g} Cel; "
            f"{temperature_C:g} Cel lies outside."
        )
        raise TemperatureProblem(says)
    return temperature_C + _ZERO_C


def _water_density_g_cm3(temperature_C: float) -> float:
    """Return the density of air-free water (Tanaka et al., Metrologia 38 (2001) 301)."""
    t = temperature_C
    reduced = (t - 3.983035) ** 2 * (t + 301.797) / (522528.9 * (t + 69.34881))
    return 0.999974950 * (1 - reduced)


def water_pKw(temperature_C: float) -> float:
    """Return pKw of water, 0 to 50 Cel, at ordinary pressure; u about 0.003.

    Marshall & Franck, J. Phys. Chem. Ref. Data 10 (1981) 295, equation 4, with the density of
    Tanaka et al. 2001; 13.995 at 25 Cel.
    """
    T = _kelvin(temperature_C)
    density_part = 13.957 - 1262.3 / T + 8.5641e5 / T**2
    logKw = -4.098 - 3245.2 / T + 2.2362e5 / T**2 - 3.984e7 / T**3
    return -(logKw + density_part * log10(_water_density_g_cm3(temperature_C)))


def water_permittivity(temperature_C: float) -> float:
    """Return the relative permittivity of water, 0 to 50 Cel.

    Malmberg & Maryott, J. Res. NBS 56 (1956) 1 (coefficients from memory, checked against the
    IAPWS 1997 formulation to 0.3 % in the tests); 78.30 at 25 Cel.
    """
    t = temperature_C
    return float(87.740 - 0.40008 * t + 9.398e-4 * t**2 - 1.410e-6 * t**3)


def davies_A(temperature_C: float) -> float:
    """Return the Debye-Hückel constant A for log10, in (kg/mol)^0.5; 0.511 at 25 Cel.

    A = 1.8248e6 * sqrt(rho) / (eps * T)^1.5, rho in g/cm3 (Debye & Hückel 1923; the number from
    the CODATA constants).
    """
    T = _kelvin(temperature_C)
    return float(
        1.82483e6
        * _water_density_g_cm3(temperature_C) ** 0.5
        / (water_permittivity(temperature_C) * T) ** 1.5
    )


@dataclass(frozen=True, slots=True)
class AcidConstant:
    """One dissociation step of an acid: pK by temperature, its u, and where it comes from."""

    name: str
    pK: Callable[[float], float]
    u: float
    source: str


def _phthalic_1(temperature_C: float) -> float:
    _kelvin(temperature_C)
    return 2.950


def _phthalic_2(temperature_C: float) -> float:
    T = _kelvin(temperature_C) + 0.01
    return 2175.83 / T - 9.55095 + 0.025694 * T


def _tris(temperature_C: float) -> float:
    T = _kelvin(temperature_C)
    return 2981.4 / T - 3.5888 + 0.005571 * T


def _carbonic_1(temperature_C: float) -> float:
    T = _kelvin(temperature_C)
    return 356.3094 + 0.06091964 * T - 21834.37 / T - 126.8339 * log10(T) + 1684915.0 / T**2


def _carbonic_2(temperature_C: float) -> float:
    T = _kelvin(temperature_C)
    return 107.8871 + 0.03252849 * T - 5151.79 / T - 38.92561 * log10(T) + 563713.9 / T**2


PHTHALIC = (
    AcidConstant(
        "phthalic acid, first step",
        _phthalic_1,
        0.01,
        "Hamer, Pinching & Acree, J. Res. NBS 35 (1945) 539: 2.950 at 25 Cel, taken at every "
        "temperature (it moves an end point by nothing that shows); value from memory",
    ),
    AcidConstant(
        "phthalic acid, second step",
        _phthalic_2,
        0.003,
        "Hamer & Acree, J. Res. NBS 35 (1945) 381: 2175.83/T - 9.55095 + 0.025694 T with "
        "T = t + 273.16; coefficients from memory, PHREEQC agrees at 25 Cel",
    ),
)
TRIS = (
    AcidConstant(
        "TRIS, its acid",
        _tris,
        0.003,
        "Bates & Hetzer, J. Phys. Chem. 65 (1961) 667: 2981.4/T - 3.5888 + 0.005571 T; "
        "coefficients from memory, 8.072 at 25 Cel",
    ),
)
CARBONIC = (
    AcidConstant(
        "carbonic acid, first step (CO2 with its hydrate)",
        _carbonic_1,
        0.005,
        "Plummer & Busenberg, Geochim. Cosmochim. Acta 46 (1982) 1011",
    ),
    AcidConstant(
        "carbonic acid, second step",
        _carbonic_2,
        0.005,
        "Plummer & Busenberg, Geochim. Cosmochim. Acta 46 (1982) 1011",
    ),
)
ACIDS = MappingProxyType({"phthalic": PHTHALIC, "TRIS": TRIS, "carbonic": CARBONIC})

U_PKW = 0.003
"""Standard uncertainty of pKw between 0 and 50 Cel (spread between formulations)."""

AIR_SATURATED_CO2_MMOL_PER_ML = 1.4e-5
"""Carbonic acid in water that stood in laboratory air, 25 Cel, mmol in each mL.

Henry's constant 0.034 mol/(L atm) (Plummer & Busenberg 1982) times 415 ppm of CO2: 14 µmol/L.
"""


def davies_log_gamma(ionic_strength: float, *, temperature_C: float = 25.0) -> float:
    """Return log10 of the activity coefficient of a singly charged ion, by Davies' equation.

    log10 gamma = -A (sqrt(I)/(1 + sqrt(I)) - 0.3 I); a charge z takes z squared times this. Good to
    about 0.01 to I = 0.1 mol/L (Davies, Ion Association, 1962).
    """
    root = ionic_strength**0.5
    return float(-davies_A(temperature_C) * (root / (1 + root) - DAVIES_SLOPE * ionic_strength))


def davies_gamma(ionic_strength: float, charge: int, *, temperature_C: float = 25.0) -> float:
    """Return the activity coefficient of an ion, dimensionless; see ``davies_log_gamma``."""
    log_gamma = davies_log_gamma(ionic_strength, temperature_C=temperature_C)
    return exp(2.302585092994046 * charge * charge * log_gamma)
