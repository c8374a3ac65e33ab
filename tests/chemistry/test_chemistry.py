import re
from fractions import Fraction

import pytest

from server.chemistry.atomic_weights import ATOMIC_WEIGHTS
from server.chemistry.cautions import DEFERRAL, cautions_for
from server.chemistry.formula import FormulaProblem, atoms_of, molar_mass
from server.chemistry.reactions import RATIOS, ratio
from server.chemistry.substances import SUBSTANCES, name_of


@pytest.mark.parametrize("element", sorted(ATOMIC_WEIGHTS))
def test_atomic_weight_agrees_with_molmass(element):
    # molmass (C. Gohlke) keeps its own table; it may hold an older or conventional value of a
    # weight that is an interval, so the interval's half-width and 3e-5 more are allowed
    from molmass import ELEMENTS

    ours = ATOMIC_WEIGHTS[element]
    assert abs(ours.value - ELEMENTS[element].mass) <= 1.05 * ours.half_width + 3e-5 * ours.value


@pytest.mark.parametrize("key", sorted(SUBSTANCES))
def test_molar_mass_of_every_substance_agrees_with_molmass(key):
    from molmass import Formula

    formula = SUBSTANCES[key].formula
    other = Formula(re.sub(r"\.(\d+)(\w+)", r"(\2)\1", formula)).mass
    # sulfur's midpoint lies 1.2e-4 above the conventional weight
    assert molar_mass(formula).value == pytest.approx(other, rel=2.5e-4)


def test_molar_mass_of_khp_is_quam_s_within_the_newer_weights():
    # QUAM A2 prints 204.2212 with u 0.0038 from an older set
    found = molar_mass("C8H5KO4")
    assert found.value == pytest.approx(204.2206, abs=5e-5)
    assert abs(found.value - 204.2212) < found.u
    assert "2021" in found.set


@pytest.mark.parametrize(
    ("formula", "atoms"),
    [
        ("KH(IO3)2", {"K": 1, "H": 1, "I": 2, "O": 6}),
        ("C2H2O4.2H2O", {"C": 2, "H": 6, "O": 6}),
        ("Na2B4O7·10H2O", {"Na": 2, "B": 4, "O": 17, "H": 20}),
        ("Fe(NH4)2(SO4)2*6H2O", {"Fe": 1, "N": 2, "H": 20, "S": 2, "O": 14}),
    ],
)
def test_atoms_of_reads_brackets_and_hydrates(formula, atoms):
    assert atoms_of(formula) == atoms


@pytest.mark.parametrize("formula", ["", "H2O)", "(H2O", "h2o", "H2O.", "H-O", "H0", "H" * 200])
def test_atoms_of_what_is_no_formula_is_refused(formula):
    with pytest.raises(FormulaProblem):
        atoms_of(formula)


def test_molar_mass_element_without_a_weight_is_refused_by_name():
    with pytest.raises(FormulaProblem, match="Xx"):
        molar_mass("XxO2")


# Each reaction's electrons, protons or ions: (per mol of titrant, per mol of what it reacts with).
EQUIVALENTS = {
    "NaOH": 1, "KOH": 1, "HCl": 1, "HClO4": 1, "H2SO4": 2, "KHP": 1, "C7H6O2": 1, "H3NO3S": 1,
    "Na2CO3": 2, "TRIS": 1, "Na2B4O7": 2, "AgNO3": 1, "NaCl": 1, "KCl": 1, "EDTA": 2, "Zn": 2,
    "ZnO": 2, "Ce(SO4)2": 1, "KMnO4": 5, "Na2S2O3": 1, "I2": 2, "KIO3": 6, "K2Cr2O7": 6,
}  # fmt: skip
# what gives another number in another reaction
SPECIAL = {
    ("NaOH", "H2C2O4"): 2, ("KOH", "H2C2O4"): 2, ("KMnO4", "H2C2O4"): 2, ("NaOH", "KH(IO3)2"): 1,
    ("Na2S2O3", "KH(IO3)2"): 12, ("HCl", "CaCO3"): 2, ("EDTA", "CaCO3"): 2,
    ("KMnO4", "Na2C2O4"): 2, ("Ce(SO4)2", "Na2C2O4"): 2,
}  # fmt: skip


@pytest.mark.parametrize("pair", sorted(RATIOS), ids="-".join)
def test_ratio_balances_electrons_protons_or_ions(pair):
    # protons of acids and bases, electrons of oxidants and reductants (2 per I2, 5 per MnO4-,
    # 6 per Cr2O7 2-), charges of ions: what one gives the other takes
    titrant, against = pair
    per_standard = SPECIAL.get(pair) or EQUIVALENTS[against]
    assert RATIOS[pair] == Fraction(per_standard, EQUIVALENTS[titrant])


def test_ratio_unknown_reaction_is_none():
    assert ratio("NaOH", "NaCl") is None


def test_cautions_every_titrant_has_lines_and_dilute_lye_is_never_harmless():
    for key in {pair[0] for pair in RATIOS}:
        (one,) = cautions_for([key])
        assert one.substance == name_of(key) or one.lines
        assert "No caution is stored" not in one.lines[0], key
    (lye,) = cautions_for(["NaOH"])
    assert "Strongly alkaline" in lye.lines[0]
    assert "first" in DEFERRAL


def test_cautions_every_substance_has_lines_of_its_own_and_says_where_they_are_from():
    for one in cautions_for(SUBSTANCES):
        assert "No caution is stored" not in one.lines[0], one.substance
        assert "memory" in one.source


@pytest.mark.parametrize(
    ("key", "word"),
    [
        ("KMnO4", "organic"),
        ("K2Cr2O7", "organic"),
        ("KIO3", "organic"),
        ("HClO4", "organic"),
        ("HCl", "cyanide"),
        ("H2SO4", "hypochlorite"),
        ("AgNO3", "ammonia"),
        ("Na2S2O3", "acid"),
    ],
)
def test_cautions_what_must_not_meet_a_substance_is_told(key, word):
    (one,) = cautions_for([key])
    assert word in " ".join(one.lines).lower()


def test_cautions_unknown_substance_sends_to_the_data_sheet():
    (one,) = cautions_for(["XyZ", "XyZ"])
    assert "safety data sheet" in one.lines[0]
