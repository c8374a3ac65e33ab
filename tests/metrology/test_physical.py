"""Water, air, buoyancy and glassware against tables and independent implementations."""

import cmath
import json
from pathlib import Path

import pytest

from server.evaluation.published import checks
from server.metrology.air import cipm_2007, iso_tr_20461
from server.metrology.buoyancy import factor
from server.metrology.glassware import interpolate_error, volume_at_20, volume_factor, z_factor
from server.metrology.water import air_saturation_change, density

PUBLISHED = json.loads(
    (Path(__file__).parents[2] / "seed_data" / "published.json").read_text(encoding="utf-8")
)


@pytest.mark.parametrize("one", checks(), ids=lambda one: one.what)
def test_published_value_is_met_to_its_printed_digits(one):
    assert one.holds, one


@pytest.mark.parametrize("t", range(1, 40, 3))
def test_water_density_agrees_with_iapws_95(t):
    # CoolProp and iapws: IAPWS-95 at 101325 Pa; Tanaka's water is SMOW, within 10 ppm of it
    from CoolProp.CoolProp import PropsSI
    from iapws import IAPWS95

    ours = density(float(t))
    assert ours == pytest.approx(PropsSI("D", "T", t + 273.15, "P", 101325, "Water"), rel=1e-5)
    assert ours == pytest.approx(IAPWS95(T=t + 273.15, P=0.101325).rho, rel=1e-5)


@pytest.mark.parametrize(
    ("t", "p", "h"), [(15, 900, 10), (20, 1013.25, 50), (25, 980, 80), (27, 1050, 30)]
)
def test_moist_air_agrees_with_coolprop_humid_air(t, p, h):
    # CoolProp's humid air (ASHRAE RP-1485), carbon dioxide and virial terms a little different
    from CoolProp.HumidAirProp import HAPropsSI

    volume = HAPropsSI("Vha", "T", t + 273.15, "P", p * 100, "R", h / 100)
    assert cipm_2007(t, p, h) == pytest.approx(1 / volume, rel=2e-4)


def test_moist_air_short_form_is_within_its_stated_uncertainty():
    # ISO/TR 20461's short form rests on the older CIPM equation: 2e-4 of its own, 0.9e-4 of argon
    for t, p, h in [(18, 950, 20), (20, 1013, 50), (27, 1040, 70)]:
        assert iso_tr_20461(t, p, h) == pytest.approx(cipm_2007(t, p, h), rel=3e-4)


def test_cipm_2007_takes_a_complex_step():
    slope = cipm_2007(complex(20, 1e-30), 1013.25, 50).imag / 1e-30
    step = (cipm_2007(20.01, 1013.25, 50) - cipm_2007(19.99, 1013.25, 50)) / 0.02
    assert slope == pytest.approx(step, rel=1e-6)
    assert not cmath.isnan(slope)


def test_buoyancy_of_khp_is_58_parts_in_1e5():
    assert factor(1.2, 1.636) == pytest.approx(1.000584, abs=1e-6)


def test_volume_factor_water_and_stated_expansion_meet_at_20():
    assert volume_factor(20.0, 9.9e-6, None) == 1.0
    assert volume_factor(20.0, 9.9e-6, 2.1e-4) == 1.0
    assert volume_factor(25.0, 9.9e-6, None) == pytest.approx(
        997.047 / 998.2067 * (1 + 4.95e-5), rel=1e-7
    )


def test_interpolate_error_is_linear_and_refuses_outside():
    table = ((0.0, 0.0), (10.0, 0.02), (20.0, -0.02))
    assert interpolate_error(table, 5.0) == pytest.approx(0.01)
    assert interpolate_error(table, 20.0) == -0.02
    assert interpolate_error(table, 0.0) == 0.0
    with pytest.raises(ValueError, match="outside"):
        interpolate_error(table, 20.1)


def test_z_factor_and_volume_at_20_follow_iso_4787():
    z = z_factor(density(22.0), 1.2)
    assert z == pytest.approx(1.00329, abs=2e-5)
    assert volume_at_20(9.9700, z, glass_expansion=9.9e-6, temperature=22.0) == pytest.approx(
        9.9700 * z * (1 - 9.9e-6 * 2), rel=1e-15
    )


def test_air_saturation_lowers_the_density_by_a_few_ppm():
    # order of magnitude only: Tanaka et al. 2001, coefficients from memory
    assert -0.005 < air_saturation_change(20.0) < -0.002
