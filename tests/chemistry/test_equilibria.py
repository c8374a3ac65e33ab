"""Acid-base constants against tables, IAPWS and PHREEQC."""

from math import log, log10

import pytest

from server.chemistry.equilibria import (
    AIR_SATURATED_CO2_MMOL_PER_ML,
    CARBONIC,
    PHTHALIC,
    TRIS,
    TemperatureProblem,
    davies_A,
    davies_gamma,
    davies_log_gamma,
    water_permittivity,
    water_pKw,
)

# CRC Handbook of Chemistry and Physics, after Marshall & Franck, J. Phys. Chem. Ref. Data 10 (1981)
# 295, at 0, 5, ..., 50 Cel
PKW = (14.938, 14.727, 14.528, 14.34, 14.163, 13.995, 13.836, 13.685, 13.542, 13.405, 13.275)


@pytest.mark.parametrize(("t", "pKw"), list(zip(range(0, 51, 5), PKW, strict=True)))
def test_water_pKw_agrees_with_the_handbook(t, pKw):
    # the handbook's three decimals, and its other density of water
    assert water_pKw(t) == pytest.approx(pKw, abs=0.001)


@pytest.mark.parametrize("t", [1, 20, 25, 50])
def test_water_permittivity_agrees_with_iapws(t):
    # IAPWS R8-97 through the iapws package; Malmberg & Maryott 1956 differ by up to 0.3 %
    from iapws import IAPWS95

    assert water_permittivity(t) == pytest.approx(
        IAPWS95(T=273.15 + t, P=0.101325).epsilon, rel=3e-3
    )


def test_davies_constant_at_25_is_that_of_the_textbooks():
    # 0.509 to 0.511 at 25 Cel, Robinson & Stokes and later tables (value from memory)
    assert davies_A(25) == pytest.approx(0.510, abs=0.002)


def test_davies_gamma_of_a_double_charge_is_the_fourth_power():
    assert davies_gamma(0.1, -2) == pytest.approx(davies_gamma(0.1, 1) ** 4)
    assert davies_gamma(0.1, 1) == pytest.approx(10 ** davies_log_gamma(0.1))
    assert davies_gamma(0.0, 1) == 1.0


def test_davies_gamma_is_near_the_measured_one_of_dilute_acid():
    # mean activity coefficient of 0.1 mol/kg HCl at 25 Cel: 0.796 (Robinson & Stokes; from memory)
    assert davies_gamma(0.1, 1) == pytest.approx(0.796, abs=0.025)


@pytest.mark.parametrize("t", [5, 15, 25, 35, 45])
def test_carbonic_acid_agrees_with_phreeqc(t):
    # phreeqc.dat holds Plummer & Busenberg 1982; pK from the activities of a dilute solution
    from phreeqpython import PhreeqPython

    engine = PhreeqPython(database="phreeqc.dat")
    solution = engine.add_solution(
        {"units": "mmol/kgw", "temp": t, "pH": "8.3", "Na": 1e-3, "C(4)": "1e-3"}
    )
    acid, half, bare = (solution.activity(name, "mol") for name in ("CO2", "HCO3-", "CO3-2"))
    assert CARBONIC[0].pK(t) == pytest.approx(8.3 - log10(half / acid), abs=0.002)
    assert CARBONIC[1].pK(t) == pytest.approx(8.3 - log10(bare / half), abs=0.002)


@pytest.mark.parametrize(
    ("step", "pK"),
    [
        # at 25 Cel: Hamer, Pinching & Acree 1945; Bates & Hetzer 1961; Plummer & Busenberg 1982
        # (values from memory)
        (PHTHALIC[0], 2.950),
        (PHTHALIC[1], 5.408),
        (TRIS[0], 8.072),
        (CARBONIC[0], 6.352),
        (CARBONIC[1], 10.329),
    ],
)
def test_constants_at_25_are_those_of_the_literature(step, pK):
    assert step.pK(25.0) == pytest.approx(pK, abs=0.001)


@pytest.mark.parametrize("t", [10, 20, 30, 40])
def test_tris_agrees_with_its_enthalpy(t):
    # Goldberg, Kishore & Lennen, J. Phys. Chem. Ref. Data 31 (2002) 231: pK 8.072, enthalpy
    # 47.45 kJ/mol, heat capacity -59 J/(mol K) at 25 Cel (values from memory)
    R, T0, T = 8.314462618, 298.15, 273.15 + t
    slope = 47450 / R * (1 / T - 1 / T0)
    bend = 59 / R * (T0 / T - 1 - log(T0 / T))
    assert TRIS[0].pK(t) == pytest.approx(8.072 + (slope + bend) / log(10), abs=0.003)


def test_every_constant_names_its_source():
    for step in (*PHTHALIC, *TRIS, *CARBONIC):
        assert any(year in step.source for year in ("1945", "1961", "1982"))
        assert step.u > 0


def test_air_saturated_water_holds_what_measurement_says():
    # 0.7 µmol in 50 mL
    assert pytest.approx(7e-4) == 50 * AIR_SATURATED_CO2_MMOL_PER_ML


@pytest.mark.parametrize("t", [-1, 51, 100])
def test_temperature_outside_is_refused_in_words(t):
    with pytest.raises(TemperatureProblem, match="hold from 0 to 50 Cel"):
        water_pKw(t)
