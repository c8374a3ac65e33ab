"""Every reaction's ratio follows from equations that balance by atoms and charge."""

from collections import Counter

import pytest

from server.chemistry.formula import atoms_of
from server.chemistry.reactions import (
    CUBIC_EXPANSION_PER_K,
    EQUIVALENTS,
    RATIOS,
    REACTIONS,
    equivalents,
    read_equation,
)
from server.chemistry.substances import SUBSTANCES

# c(1/z X) is what makes these whole: protons, electrons or chloride that one unit of the standard
# takes up or gives, counted by hand from the oxidation states, apart from the equations
HAND_COUNTED = {
    ("NaOH", "KHP"): 1,
    ("NaOH", "H2C2O4"): 2,
    ("H2SO4", "Na2CO3"): 2,  # two protons
    ("H2SO4", "TRIS"): 1,
    ("Na2S2O3", "KIO3"): 6,  # iodine from +5 to -1
    ("Na2S2O3", "KH(IO3)2"): 12,
    ("Na2S2O3", "K2Cr2O7"): 6,  # two chromium from +6 to +3
    ("I2", "Na2S2O3"): 1,  # sulfur from +2 to +2.5, two of them
    ("KMnO4", "Na2C2O4"): 2,  # two carbon from +3 to +4
    ("Ce(SO4)2", "Na2C2O4"): 2,
    ("AgNO3", "NaCl"): 1,
}


def _content(side):
    atoms, charge = Counter(), 0
    for one in side:
        charge += one.coefficient * one.charge
        for element, n in atoms_of(one.formula).items():
            atoms[element] += one.coefficient * n
    return atoms, charge


def _balances(equation):
    return _content(equation.left) == _content(equation.right)


@pytest.mark.parametrize("pair", sorted(RATIOS), ids="-".join)
def test_every_step_of_a_reaction_balances_by_atoms_and_charge(pair):
    for step in REACTIONS[pair].steps:
        assert _balances(step), step


@pytest.mark.parametrize("pair", sorted(RATIOS), ids="-".join)
def test_ratio_equals_that_of_the_balanced_steps(pair):
    reaction = REACTIONS[pair]
    assert reaction.ratio_of_steps() == RATIOS[pair]


@pytest.mark.parametrize("pair", sorted(RATIOS), ids="-".join)
def test_path_of_a_reaction_begins_at_the_standard_and_ends_at_the_titrant(pair):
    reaction = REACTIONS[pair]
    titrant, standard = (SUBSTANCES[key].formula for key in pair)
    assert len(reaction.path) == len(reaction.steps) + 1
    assert atoms_of(reaction.path[0]) in (atoms_of(standard), _without_water(standard))
    # a titrant is dissolved: its water of crystallization is left out
    assert atoms_of(reaction.path[-1]) == _without_water(titrant)
    assert reaction.indicator
    assert "memory" in reaction.indicator_source


def _without_water(formula):
    return atoms_of(formula.split(".")[0])


def test_iodate_and_dichromate_are_told_in_both_half_steps():
    for standard in ("KIO3", "KH(IO3)2", "K2Cr2O7"):
        reaction = REACTIONS["Na2S2O3", standard]
        assert reaction.path.count("I2") == 1
        assert len([step for step in reaction.steps if _has(step, "I2")]) == 2


def _has(step, formula):
    return any(one.formula == formula for one in (*step.left, *step.right))


@pytest.mark.parametrize("pair", sorted(HAND_COUNTED), ids="-".join)
def test_equivalents_of_a_titrant_times_the_ratio_are_the_standard_s(pair):
    assert equivalents(pair[0]) * RATIOS[pair] == HAND_COUNTED[pair]


def test_equivalents_every_titrant_has_them_and_an_unknown_has_none():
    assert {pair[0] for pair in RATIOS} == set(EQUIVALENTS)
    assert equivalents("XyZ") is None


@pytest.mark.parametrize(
    "wrong",
    [
        "IO3^- + 5 I^- + 5 H^+ = 3 I2 + 3 H2O",  # hydrogen and charge
        "I2 + 2 S2O3^2- = 2 I^- + S4O6^-",  # charge alone
        "Ce^4+ + C2O4^2- = Ce^3+ + 2 CO2",  # charge alone
    ],
)
def test_an_equation_with_a_wrong_coefficient_or_charge_does_not_balance(wrong):
    assert not _balances(read_equation(wrong))


@pytest.mark.parametrize("text", ["", "I2", "A = B = C", "2  I2 = I2", "I2 = "])
def test_read_equation_what_is_none_is_refused(text):
    with pytest.raises(ValueError, match="is no"):
        read_equation(text)


def test_equation_coefficient_of_what_it_lacks_is_refused():
    with pytest.raises(KeyError):
        read_equation("Ag^+ + Cl^- = AgCl").coefficient("Br^-")


def test_every_titrant_has_storage_and_every_standard_drying():
    for titrant, against in RATIOS:
        assert SUBSTANCES[titrant].storage, titrant
        # a titrant may be what another is titrated against
        assert SUBSTANCES[against].drying or SUBSTANCES[against].storage, against


def test_every_density_names_its_source():
    for one in SUBSTANCES.values():
        assert (one.density_g_cm3 is None) == (one.density_source is None), one.key


def test_perchloric_acid_in_acetic_acid_states_its_expansion():
    # 0.55 % for 5 K, from memory
    assert CUBIC_EXPANSION_PER_K["HClO4"] * 5 == pytest.approx(0.0055)
