"""Which masses of a primary standard make good use of a burette."""

from dataclasses import dataclass
from fractions import Fraction

from server.chemistry.formula import FormulaProblem, molar_mass
from server.chemistry.reactions import ratio as reaction_ratio
from server.chemistry.substances import SUBSTANCES

#: The part of the burette's capacity that a titration should use.
LEAST, MOST = 0.60, 0.90


@dataclass(frozen=True, slots=True)
class MassWindow:
    """The masses in g that deliver 60 to 90 % of a burette."""

    low_g: float
    high_g: float


def mass_window(
    titrant: str,
    standard: str,
    *,
    nominal_mol_L: float,
    capacity_mL: float,
    ratio: Fraction | None = None,
) -> MassWindow | None:
    """Return the mass window, or None where no table knows the reaction or the molar mass.

    m = c · V · M / r, with c nominal in mol/L, V in L, M in g/mol and r the amount of titrant per
    amount of standard; a mass fraction of one and 20 °C are near enough to plan with.
    """
    if ratio is None:
        ratio = reaction_ratio(titrant, standard)
    substance = SUBSTANCES.get(standard)
    try:
        grams_per_mol = molar_mass(substance.formula if substance else standard).value
    except FormulaProblem:
        return None
    if not ratio:
        return None
    full = nominal_mol_L * capacity_mL / 1000.0 * grams_per_mol / float(ratio)
    return MassWindow(low_g=LEAST * full, high_g=MOST * full)
