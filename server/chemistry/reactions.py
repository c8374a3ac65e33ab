"""Reactions of titrants with standards: amount of titrant per amount of standard, and why.

The ratios and the equations are written down apart from each other, so that a test can compare
them. Indicators and the cubic expansion are common practice, from memory.
"""

import re
from collections.abc import Mapping
from dataclasses import dataclass
from fractions import Fraction
from itertools import pairwise
from types import MappingProxyType

#: (titrant, standard or reference titrant): mol of titrant per mol of standard, by stoichiometry.
RATIOS: Mapping[tuple[str, str], Fraction] = MappingProxyType(
    {
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
        ("HCl", "Na2CO3"): Fraction(2),
        ("H2SO4", "Na2CO3"): Fraction(1),
        ("HCl", "TRIS"): Fraction(1),
        ("H2SO4", "TRIS"): Fraction(1, 2),
        ("HCl", "Na2B4O7"): Fraction(2),
        ("H2SO4", "Na2B4O7"): Fraction(1),
        ("HCl", "CaCO3"): Fraction(2),
        ("Na2S2O3", "KIO3"): Fraction(6),
        ("Na2S2O3", "KH(IO3)2"): Fraction(12),
        ("Na2S2O3", "K2Cr2O7"): Fraction(6),
        ("Na2S2O3", "I2"): Fraction(2),
        ("I2", "Na2S2O3"): Fraction(1, 2),
        ("KMnO4", "Na2C2O4"): Fraction(2, 5),
        ("KMnO4", "H2C2O4"): Fraction(2, 5),
        ("Ce(SO4)2", "Na2C2O4"): Fraction(2),
        ("AgNO3", "NaCl"): Fraction(1),
        ("AgNO3", "KCl"): Fraction(1),
        ("EDTA", "CaCO3"): Fraction(1),
        ("EDTA", "Zn"): Fraction(1),
        ("EDTA", "ZnO"): Fraction(1),
        # acid and base titrants against each other
        ("NaOH", "HCl"): Fraction(1),
        ("HCl", "NaOH"): Fraction(1),
        ("KOH", "HCl"): Fraction(1),
        ("HCl", "KOH"): Fraction(1),
        ("NaOH", "H2SO4"): Fraction(2),
        ("H2SO4", "NaOH"): Fraction(1, 2),
    }
)

#: z of a titrant for c(1/z X): protons, electrons or ions that one formula unit takes or gives.
#: Of EDTA and of silver nitrate the formula unit itself is usual.
EQUIVALENTS: Mapping[str, int] = MappingProxyType(
    {
        "NaOH": 1,
        "KOH": 1,
        "HCl": 1,
        "H2SO4": 2,
        "HClO4": 1,
        "Na2S2O3": 1,
        "KMnO4": 5,
        "AgNO3": 1,
        "EDTA": 1,
        "I2": 2,
        "Ce(SO4)2": 1,
    }
)

#: Cubic expansion in 1/K of a titrant that is not made with water, by key: perchloric acid in
#: glacial acetic acid. From memory (pharmacopoeias commonly give 1.1e-3); a supplier's own goes
#: before it.
CUBIC_EXPANSION_PER_K: Mapping[str, float] = MappingProxyType({"HClO4": 1.1e-3})


@dataclass(frozen=True, slots=True)
class Species:
    """A formula with its charge in elementary charges and its coefficient in an equation."""

    formula: str
    charge: int
    coefficient: int


@dataclass(frozen=True, slots=True)
class Equation:
    """A balanced equation: what reacts and what forms."""

    left: tuple[Species, ...]
    right: tuple[Species, ...]

    def coefficient(self, species: str) -> int:
        """Return the coefficient of a species as written, such as ``IO3^-``.

        Raises:
            KeyError: the equation does not have it.
        """
        wanted = _species(species)
        for one in (*self.left, *self.right):
            if (one.formula, one.charge) == (wanted.formula, wanted.charge):
                return one.coefficient
        raise KeyError(species)


@dataclass(frozen=True, slots=True)
class Reaction:
    """How a titrant reacts with a standard, step by step from the standard to the titrant.

    ``path`` names the species that carries the amount from each step to the next: its first is
    the standard, its last the titrant, so it is longer than ``steps`` by one.
    """

    titrant: str
    against: str
    steps: tuple[Equation, ...]
    path: tuple[str, ...]
    indicator: str
    indicator_source: str = "common practice, from memory"

    def ratio_of_steps(self) -> Fraction:
        """Return mol of titrant per mol of standard as the steps' coefficients give it."""
        found = Fraction(1)
        for step, (taken, given) in zip(self.steps, pairwise(self.path), strict=True):
            found *= Fraction(step.coefficient(given), step.coefficient(taken))
        return found


_SPECIES = re.compile(r"(?:(\d+) )?([^\s^]+?)(?:\^(\d*)([+-]))?")


def _species(text: str) -> Species:
    match = _SPECIES.fullmatch(text)
    if match is None:
        raise ValueError(f"“{text}” is no species; write for example 2 MnO4^- or C2O4^2-")
    charge = int(match[3] or 1) * (1 if match[4] == "+" else -1) if match[4] else 0
    return Species(match[2], charge, int(match[1] or 1))


def read_equation(text: str) -> Equation:
    """Return an equation written like ``I2 + 2 S2O3^2- = 2 I^- + S4O6^2-``.

    Raises:
        ValueError: it is not written like that.
    """
    sides = text.split(" = ")
    if len(sides) != 2:
        raise ValueError(f"“{text}” is no equation: it needs one = between spaces")
    left, right = (tuple(_species(one) for one in side.split(" + ")) for side in sides)
    return Equation(left, right)


# What a substance gives in the flask: (the equation, the species that goes on to react).
_GIVES: Mapping[str, tuple[str, str, str]] = MappingProxyType(
    {
        "NaOH": ("NaOH", "NaOH = Na^+ + OH^-", "OH^-"),
        "KOH": ("KOH", "KOH = K^+ + OH^-", "OH^-"),
        "HCl": ("HCl", "HCl = H^+ + Cl^-", "H^+"),
        "H2SO4": ("H2SO4", "H2SO4 = 2 H^+ + SO4^2-", "H^+"),
        "HClO4": ("HClO4", "HClO4 = H^+ + ClO4^-", "H^+"),
        "Na2S2O3": ("Na2S2O3", "Na2S2O3 = 2 Na^+ + S2O3^2-", "S2O3^2-"),
        "KMnO4": ("KMnO4", "KMnO4 = K^+ + MnO4^-", "MnO4^-"),
        "AgNO3": ("AgNO3", "AgNO3 = Ag^+ + NO3^-", "Ag^+"),
        "EDTA": ("C10H14N2Na2O8", "C10H14N2Na2O8 = 2 Na^+ + C10H14N2O8^2-", "C10H14N2O8^2-"),
        "Ce(SO4)2": ("Ce(SO4)2", "Ce(SO4)2 = Ce^4+ + 2 SO4^2-", "Ce^4+"),
        "KHP": ("C8H5KO4", "C8H5KO4 = K^+ + C8H5O4^-", "C8H5O4^-"),
        "Na2CO3": ("Na2CO3", "Na2CO3 = 2 Na^+ + CO3^2-", "CO3^2-"),
        "Na2B4O7": ("Na2B4O7.10H2O", "Na2B4O7.10H2O = 2 Na^+ + B4O7^2- + 10 H2O", "B4O7^2-"),
        "H2C2O4": ("C2H2O4.2H2O", "C2H2O4.2H2O = C2H2O4 + 2 H2O", "C2H2O4"),
        "KIO3": ("KIO3", "KIO3 = K^+ + IO3^-", "IO3^-"),
        "KH(IO3)2": ("KH(IO3)2", "KH(IO3)2 = K^+ + H^+ + 2 IO3^-", "IO3^-"),
        "K2Cr2O7": ("K2Cr2O7", "K2Cr2O7 = 2 K^+ + Cr2O7^2-", "Cr2O7^2-"),
        "Na2C2O4": ("Na2C2O4", "Na2C2O4 = 2 Na^+ + C2O4^2-", "C2O4^2-"),
        "NaCl": ("NaCl", "NaCl = Na^+ + Cl^-", "Cl^-"),
        "KCl": ("KCl", "KCl = K^+ + Cl^-", "Cl^-"),
        "CaCO3": ("CaCO3", "CaCO3 + 2 H^+ = Ca^2+ + CO2 + H2O", "Ca^2+"),
        "Zn": ("Zn", "Zn + 2 H^+ = Zn^2+ + H2", "Zn^2+"),
        "ZnO": ("ZnO", "ZnO + 2 H^+ = Zn^2+ + H2O", "Zn^2+"),
    }
)

_THIOSULFATE = "I2 + 2 S2O3^2- = 2 I^- + S4O6^2-"
_IODATE = "IO3^- + 5 I^- + 6 H^+ = 3 I2 + 3 H2O"
_DICHROMATE = "Cr2O7^2- + 6 I^- + 14 H^+ = 2 Cr^3+ + 3 I2 + 7 H2O"
_WATER = "H^+ + OH^- = H2O"
_PHTHALEIN = "phenolphthalein"
_METHYL_RED = "methyl red"
_STARCH = "starch, added late"
_CHLORIDE = "potassium chromate, or a silver electrode"
_ZINC = "eriochrome black T at pH 10, or xylenol orange at pH 5 to 6"
_GREEN = "bromocresol green"

# (titrant, against): (what happens between what both give, indicator).
_HAPPENS: Mapping[tuple[str, str], tuple[tuple[str, ...], str]] = MappingProxyType(
    {
        ("NaOH", "KHP"): (("C8H5O4^- + OH^- = C8H4O4^2- + H2O",), _PHTHALEIN),
        ("KOH", "KHP"): (("C8H5O4^- + OH^- = C8H4O4^2- + H2O",), _PHTHALEIN),
        ("HClO4", "KHP"): (("C8H5O4^- + H^+ = C8H6O4",), "crystal violet"),
        ("NaOH", "C7H6O2"): (("C7H6O2 + OH^- = C7H5O2^- + H2O",), _PHTHALEIN),
        ("KOH", "C7H6O2"): (("C7H6O2 + OH^- = C7H5O2^- + H2O",), _PHTHALEIN),
        ("NaOH", "H3NO3S"): (("H3NO3S + OH^- = H2NO3S^- + H2O",), "bromothymol blue"),
        ("KOH", "H3NO3S"): (("H3NO3S + OH^- = H2NO3S^- + H2O",), "bromothymol blue"),
        ("NaOH", "KH(IO3)2"): ((_WATER,), "bromothymol blue"),
        ("NaOH", "H2C2O4"): (("C2H2O4 + 2 OH^- = C2O4^2- + 2 H2O",), _PHTHALEIN),
        ("KOH", "H2C2O4"): (("C2H2O4 + 2 OH^- = C2O4^2- + 2 H2O",), _PHTHALEIN),
        ("HCl", "Na2CO3"): (("CO3^2- + 2 H^+ = CO2 + H2O",), f"{_GREEN}, boiled and finished"),
        ("H2SO4", "Na2CO3"): (("CO3^2- + 2 H^+ = CO2 + H2O",), f"{_GREEN}, boiled and finished"),
        ("HCl", "TRIS"): (("C4H11NO3 + H^+ = C4H12NO3^+",), _GREEN),
        ("H2SO4", "TRIS"): (("C4H11NO3 + H^+ = C4H12NO3^+",), _GREEN),
        ("HCl", "Na2B4O7"): (("B4O7^2- + 2 H^+ + 5 H2O = 4 H3BO3",), _METHYL_RED),
        ("H2SO4", "Na2B4O7"): (("B4O7^2- + 2 H^+ + 5 H2O = 4 H3BO3",), _METHYL_RED),
        ("HCl", "CaCO3"): (("CaCO3 + 2 H^+ = Ca^2+ + CO2 + H2O",), f"{_GREEN}, after boiling"),
        ("Na2S2O3", "KIO3"): ((_IODATE, _THIOSULFATE), _STARCH),
        ("Na2S2O3", "KH(IO3)2"): ((_IODATE, _THIOSULFATE), _STARCH),
        ("Na2S2O3", "K2Cr2O7"): ((_DICHROMATE, _THIOSULFATE), _STARCH),
        ("Na2S2O3", "I2"): ((_THIOSULFATE,), _STARCH),
        ("I2", "Na2S2O3"): ((_THIOSULFATE,), "starch"),
        ("KMnO4", "Na2C2O4"): (
            ("2 MnO4^- + 5 C2O4^2- + 16 H^+ = 2 Mn^2+ + 10 CO2 + 8 H2O",),
            "its own colour",
        ),
        ("KMnO4", "H2C2O4"): (
            ("2 MnO4^- + 5 C2H2O4 + 6 H^+ = 2 Mn^2+ + 10 CO2 + 8 H2O",),
            "its own colour",
        ),
        ("Ce(SO4)2", "Na2C2O4"): (("2 Ce^4+ + C2O4^2- = 2 Ce^3+ + 2 CO2",), "ferroin"),
        ("AgNO3", "NaCl"): (("Ag^+ + Cl^- = AgCl",), _CHLORIDE),
        ("AgNO3", "KCl"): (("Ag^+ + Cl^- = AgCl",), _CHLORIDE),
        ("EDTA", "CaCO3"): (
            ("Ca^2+ + C10H14N2O8^2- = C10H12N2O8Ca^2- + 2 H^+",),
            "calconcarboxylic acid, or eriochrome black T with a little magnesium",
        ),
        ("EDTA", "Zn"): (("Zn^2+ + C10H14N2O8^2- = C10H12N2O8Zn^2- + 2 H^+",), _ZINC),
        ("EDTA", "ZnO"): (("Zn^2+ + C10H14N2O8^2- = C10H12N2O8Zn^2- + 2 H^+",), _ZINC),
        ("NaOH", "HCl"): ((_WATER,), _PHTHALEIN),
        ("HCl", "NaOH"): ((_WATER,), _METHYL_RED),
        ("KOH", "HCl"): ((_WATER,), _PHTHALEIN),
        ("HCl", "KOH"): ((_WATER,), _METHYL_RED),
        ("NaOH", "H2SO4"): ((_WATER,), _PHTHALEIN),
        ("H2SO4", "NaOH"): ((_WATER,), _METHYL_RED),
    }
)
# what reacts as it is, without an equation of its own before it, and what gives another species
_AS_IT_IS = {"C7H6O2": "C7H6O2", "H3NO3S": "H3NO3S", "TRIS": "C4H11NO3", "I2": "I2"}
_OTHER_SPECIES = {("NaOH", "KH(IO3)2"): "H^+"}


def _reaction(titrant: str, against: str) -> Reaction:
    texts, indicator = _HAPPENS[titrant, against]
    steps, path = list(texts), ["I2"] * (len(texts) - 1)
    if against in _AS_IT_IS or (titrant, against) == ("HCl", "CaCO3"):
        path.insert(0, _AS_IT_IS.get(against, against))
    else:
        formula, equation, gives = _GIVES[against]
        steps.insert(0, equation)
        path[:0] = [formula, _OTHER_SPECIES.get((titrant, against), gives)]
    if titrant in _AS_IT_IS:
        path.append(_AS_IT_IS[titrant])
    else:
        formula, equation, gives = _GIVES[titrant]
        steps.append(equation)
        path += [gives, formula]
    return Reaction(
        titrant, against, tuple(read_equation(one) for one in steps), tuple(path), indicator
    )


#: Every reaction of ``RATIOS`` with its equations and usual indicator.
REACTIONS: Mapping[tuple[str, str], Reaction] = MappingProxyType(
    {pair: _reaction(*pair) for pair in _HAPPENS}
)


def ratio(titrant: str, against: str) -> Fraction | None:
    """Return the amount of titrant per amount of what it is titrated against, None if unknown."""
    return RATIOS.get((titrant, against))


def equivalents(titrant: str) -> int | None:
    """Return z of a titrant for its concentration as c(1/z X), None if unknown."""
    return EQUIVALENTS.get(titrant)
