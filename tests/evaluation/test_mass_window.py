"""Masses that use a burette well."""

from fractions import Fraction

import pytest

from server.evaluation.mass_window import mass_window


def test_window_delivers_60_to_90_percent_of_the_burette() -> None:
    # M(KHP) = 204.2212 g/mol (QUAM:2012, A2); 0.1 mol/L from 25 mL is 2.5 mmol
    window = mass_window("NaOH", "KHP", nominal_mol_L=0.1, capacity_mL=25.0)
    assert window.low_g == pytest.approx(0.60 * 2.5e-3 * 204.2212, rel=1e-4)
    assert window.high_g == pytest.approx(0.90 * 2.5e-3 * 204.2212, rel=1e-4)


def test_window_takes_the_ratio_of_the_reaction_or_a_stated_one() -> None:
    by_table = mass_window("HCl", "Na2CO3", nominal_mol_L=0.1, capacity_mL=25.0)
    stated = mass_window("HCl", "Na2CO3", nominal_mol_L=0.1, capacity_mL=25.0, ratio=Fraction(1))
    assert stated.low_g == pytest.approx(2 * by_table.low_g)


@pytest.mark.parametrize(("titrant", "standard"), [("NaOH", "NaCl"), ("NaOH", "unknown")])
def test_window_nobody_can_tell_is_none(titrant, standard) -> None:
    assert mass_window(titrant, standard, nominal_mol_L=0.1, capacity_mL=25.0) is None


def test_window_of_an_unknown_substance_with_a_stated_ratio_is_none() -> None:
    found = mass_window("X", "Qq9", nominal_mol_L=0.1, capacity_mL=25.0, ratio=Fraction(1))
    assert found is None
