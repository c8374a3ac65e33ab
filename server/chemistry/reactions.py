"""Reactions of titrants with standards: amount of titrant per amount of standard."""

from collections.abc import Mapping
from fractions import Fraction
from types import MappingProxyType

#: (titrant, standard or reference titrant): mol of titrant per mol of standard, by stoichiometry.
RATIOS: Mapping[tuple[str, str], Fraction] = MappingProxyType(
    {
        # one proton of the hydrogen phthalate
        ("NaOH", "KHP"): Fraction(1),
        ("KOH", "KHP"): Fraction(1),
        ("HClO4", "KHP"): Fraction(1),
        ("NaOH", "C7H6O2"): Fraction(1),
        ("KOH", "C7H6O2"): Fraction(1),
        ("NaOH", "H3NO3S"): Fraction(1),
        ("KOH", "H3NO3S"): Fraction(1),
        ("NaOH", "KH(IO3)2"): Fraction(1),
        ("NaOH", "H2C2O4"): Fraction(2),
        ("KOH", "H2C2O4"): Fraction(2),
        # CO3 2- + 2 H+ = CO2 + H2O
        ("HCl", "Na2CO3"): Fraction(2),
        ("H2SO4", "Na2CO3"): Fraction(1),
        ("HCl", "TRIS"): Fraction(1),
        ("H2SO4", "TRIS"): Fraction(1, 2),
        # B4O7 2- + 2 H+ + 5 H2O = 4 H3BO3
        ("HCl", "Na2B4O7"): Fraction(2),
        ("H2SO4", "Na2B4O7"): Fraction(1),
        ("HCl", "CaCO3"): Fraction(2),
        # IO3 - + 5 I- + 6 H+ = 3 I2 + 3 H2O; I2 + 2 S2O3 2- = 2 I- + S4O6 2-
        ("Na2S2O3", "KIO3"): Fraction(6),
        ("Na2S2O3", "KH(IO3)2"): Fraction(12),
        # Cr2O7 2- + 6 I- + 14 H+ = 2 Cr3+ + 3 I2 + 7 H2O
        ("Na2S2O3", "K2Cr2O7"): Fraction(6),
        ("Na2S2O3", "I2"): Fraction(2),
        ("I2", "Na2S2O3"): Fraction(1, 2),
        # 2 MnO4 - + 5 C2O4 2- + 16 H+ = 2 Mn2+ + 10 CO2 + 8 H2O
        ("KMnO4", "Na2C2O4"): Fraction(2, 5),
        ("KMnO4", "H2C2O4"): Fraction(2, 5),
        # 2 Ce4+ + C2O4 2- = 2 Ce3+ + 2 CO2
        ("Ce(SO4)2", "Na2C2O4"): Fraction(2),
        ("AgNO3", "NaCl"): Fraction(1),
        ("AgNO3", "KCl"): Fraction(1),
        ("EDTA", "CaCO3"): Fraction(1),
        ("EDTA", "Zn"): Fraction(1),
        # acid and base titrants against each other
        ("NaOH", "HCl"): Fraction(1),
        ("HCl", "NaOH"): Fraction(1),
        ("KOH", "HCl"): Fraction(1),
        ("HCl", "KOH"): Fraction(1),
        ("NaOH", "H2SO4"): Fraction(2),
        ("H2SO4", "NaOH"): Fraction(1, 2),
    }
)


def ratio(titrant: str, against: str) -> Fraction | None:
    """Return the amount of titrant per amount of what it is titrated against, None if unknown."""
    return RATIOS.get((titrant, against))
