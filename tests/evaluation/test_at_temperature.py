"""A concentration at the temperature of use."""

import math

import pytest

from server.evaluation.at_temperature import concentration_at
from server.metrology.quantity import read_quantity

C20 = {"value": 0.10214, "u": 0.00010, "k": 2.0, "coverage": 0.95, "unit": "mol/L"}
#: Density of water in kg/m3: Tanaka et al., Metrologia 38 (2001) 301-309, table.
TANAKA = {0: 999.8428, 10: 999.7027, 20: 998.2067, 30: 995.6488, 40: 992.2152}


@pytest.mark.parametrize("celsius", list(TANAKA))
def test_concentration_of_a_watery_titrant_follows_the_published_density(celsius) -> None:
    found = concentration_at(C20, float(celsius), expansion=None)
    # seven figures are printed: half a unit of the last is 5e-8 relative, in both densities
    expected = C20["value"] * TANAKA[celsius] / TANAKA[20]
    assert found["value"] == pytest.approx(expected, rel=1.1e-7)


def test_concentration_with_a_stated_expansion_is_linear_in_it() -> None:
    beta = read_quantity({"value": "1.1e-3", "unit": "1/K", "u": "1e-4"}, "b", unit="1/K")
    found = concentration_at(C20, 25.0, expansion=beta)
    # measurement of a titrant in acetic acid: 0.55 % for 5 K
    assert found["value"] == pytest.approx(0.10214 * (1 - 0.0055), rel=1e-12)
    parts = (1e-4 * (1 - 0.0055), 0.10214 * 1.1e-3 * 0.5 / math.sqrt(3), 0.10214 * 5 * 1e-4)
    assert found["u"] == pytest.approx(math.hypot(*parts), rel=1e-12)
    assert "stated expansion" in found["says"]


def test_concentration_adds_the_uncertainty_of_half_a_degree() -> None:
    found = concentration_at(C20, 30.0, expansion=None)
    # slope of the published densities from 25 to 35 °C (997.0470, 994.0326 kg/m3), per °C
    slope = (994.0326 - 997.0470) / 10 / TANAKA[20]
    factor = TANAKA[30] / TANAKA[20]
    expected = math.hypot(1e-4 * factor, 0.10214 * slope * 0.5 / math.sqrt(3))
    assert found["u"] == pytest.approx(expected, rel=1e-3)
    assert found["U"] == found["k"] * found["u"]


def test_concentration_at_20_degrees_keeps_its_value_and_gains_uncertainty() -> None:
    found = concentration_at(C20, 20.0, expansion=None)
    assert found["value"] == C20["value"]
    assert found["u"] > C20["u"]
    assert found["reported"] == "0.10214 ± 0.00020 mol/L (k = 2.0)"


@pytest.mark.parametrize("celsius", [-0.1, 40.1, math.inf, math.nan])
def test_concentration_outside_0_to_40_degrees_is_refused(celsius) -> None:
    with pytest.raises(ValueError, match="0 to 40"):
        concentration_at(C20, celsius, expansion=None)
