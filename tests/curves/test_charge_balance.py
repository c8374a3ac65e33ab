"""V(pH) against pH(V) by bisection, PHREEQC, and its own derivatives by differences."""

import numpy as np
import pytest

from server.curves.model.charge_balance import ChargeBalance, Chemistry, Flask
from server.curves.model.systems import SYSTEMS

VOLUMES = {
    "khp-naoh": [0.0, 2.0, 10.0, 18.0, 19.9, 20.0, 20.1, 22.0, 26.0],
    "tris-hcl": [1.0, 5.0, 11.0, 20.0, 21.9, 22.0, 22.1, 25.0, 30.0],
    "carbonate-hcl": [0.5, 5.0, 9.9, 10.1, 15.0, 19.8, 20.0, 20.2, 25.0],
}


def converged(balance, pH, chemistry, V):
    """The volumes with activity coefficients that fit their own ionic strength."""
    ln_gamma = balance.ln_gamma(balance.start_ionic_strength(V, chemistry.c))
    for _ in range(12):
        found = balance.at(pH, chemistry, ln_gamma=ln_gamma)
        ln_gamma = balance.ln_gamma(balance.ionic_strength(found, chemistry, V))
    return balance.at(pH, chemistry, ln_gamma=ln_gamma), ln_gamma


@pytest.mark.parametrize("activities", [True, False])
@pytest.mark.parametrize("name", list(SYSTEMS))
def test_volume_of_the_pH_found_by_bisection_is_the_volume(name, activities, usual):
    truth = usual[name]
    truth.activities = activities
    truth.n0 = 7e-4 if name == "khp-naoh" else 0.0
    V = np.array(VOLUMES[name])
    balance = ChargeBalance(SYSTEMS[name], Flask(truth.V0, truth.n), activities=activities)
    chemistry = Chemistry(balance.pK, truth.c, truth.f, truth.n0)
    found, _ = converged(balance, truth.pH(V), chemistry, V)
    # both ways carry pKw, pK and A to four figures of their own
    assert pytest.approx(V, abs=2e-3) == found.V
    apart_in_pH = (found.V - V) / found.slope
    assert np.abs(apart_in_pH).max() < 1e-3


@pytest.mark.parametrize("V", [1.0, 5.0, 10.0, 15.0, 19.0, 19.9, 20.1, 21.0, 24.0])
def test_pH_of_phthalate_agrees_with_phreeqc(V):
    # PHREEQC as an independent equilibrium engine: phthalate with log K 5.408 and 8.358
    # (Hamer & Acree 1945) and no gamma line, so that Davies' equation applies to it; sodium,
    # potassium and water keep the database's own activity coefficients
    from phreeqpython import PhreeqPython

    engine = PhreeqPython()
    engine.ip.run_string(
        "SOLUTION_MASTER_SPECIES\nPhth Phth-2 0 164.1 164.1\n"
        "SOLUTION_SPECIES\nPhth-2 = Phth-2\n log_k 0\nPhth-2 + H+ = HPhth-\n log_k 5.408\n"
        "Phth-2 + 2 H+ = H2Phth\n log_k 8.358\nEND\n"
    )
    V0, n, c = 50.0, 2.0, 0.1
    solution = engine.add_solution(
        {
            "units": "mol/kgw",
            "temp": 25,
            "pH": "7 charge",
            "K": n / (V0 + V),
            "Phth": n / (V0 + V),
            "Na": c * V / (V0 + V),
        }
    )
    pH = np.array([solution.pH])
    balance = ChargeBalance(SYSTEMS["khp-naoh"], Flask(V0, n))
    found, _ = converged(balance, pH, Chemistry(balance.pK, c), np.array([V]))
    apart = float((found.V[0] - V) / found.slope[0])
    assert abs(apart) < (0.0025 if V < 20 else 0.012)


@pytest.mark.parametrize("name", list(SYSTEMS))
def test_derivatives_agree_with_differences(name, usual):
    truth = usual[name]
    V = np.array(VOLUMES[name])
    pH = truth.pH(V)
    flask = Flask(truth.V0, truth.n)
    balance = ChargeBalance(SYSTEMS[name], flask)
    chemistry = Chemistry(balance.pK, truth.c, truth.f, truth.n0 + 5e-4)
    found, ln_gamma = converged(balance, pH, chemistry, V)

    def volume(**changed):
        other = ChargeBalance(SYSTEMS[name], changed.pop("flask", flask))
        if "pKw" in changed:
            other._exponents[-1, 2] -= np.log(10) * changed.pop("pKw")
        at = changed.pop("pH", pH)
        return other.at(at, chemistry._replace(**changed), ln_gamma=ln_gamma).V

    def difference(step, plus, minus):
        return (volume(**plus) - volume(**minus)) / (2 * step)

    h = 1e-5
    assert found.slope == pytest.approx(difference(h, {"pH": pH + h}, {"pH": pH - h}), rel=1e-6)
    for step in range(len(balance.pK)):
        up, down = list(balance.pK), list(balance.pK)
        up[step] += h
        down[step] -= h
        expected = difference(h, {"pK": tuple(up)}, {"pK": tuple(down)})
        assert balance.per_pK(found, step) == pytest.approx(expected, rel=1e-6, abs=1e-9)
    expected = difference(h, {"pKw": h}, {"pKw": -h})
    assert balance.per_pKw(found) == pytest.approx(expected, rel=1e-6, abs=1e-9)
    expected = difference(
        1e-3, {"flask": Flask(truth.V0 + 1e-3, truth.n)}, {"flask": Flask(truth.V0 - 1e-3, truth.n)}
    )
    assert balance.per_flask_volume(found) == pytest.approx(expected, rel=1e-6, abs=1e-9)
    effective = truth.effective_mL
    expected = difference(
        1e-4,
        {"c": truth.c * effective / (effective + 1e-4)},
        {"c": truth.c * effective / (effective - 1e-4)},
    )
    assert balance.per_effective(found, effective) == pytest.approx(expected, rel=1e-6)


def test_derivatives_by_carbonate_agree_with_differences(usual):
    truth = usual["khp-naoh"]
    V = np.array(VOLUMES["khp-naoh"])
    balance = ChargeBalance(SYSTEMS["khp-naoh"], Flask(truth.V0, truth.n))
    chemistry = Chemistry(balance.pK, truth.c, truth.f, 5e-4)
    found, ln_gamma = converged(balance, truth.pH(V), chemistry, V)

    def volume(f, n0):
        # at constant effective volume the total alkalinity follows f
        c = truth.c * (1 - truth.f) / (1 - f)
        other = Chemistry(balance.pK, c, f, n0)
        return balance.at(truth.pH(V), other, ln_gamma=ln_gamma).V

    h = 1e-6
    by_f = (volume(truth.f + h, 5e-4) - volume(truth.f - h, 5e-4)) / (2 * h)
    by_n0 = (volume(truth.f, 5e-4 + h) - volume(truth.f, 5e-4 - h)) / (2 * h)
    assert balance.per_carbonate(found, chemistry) == pytest.approx(by_f, rel=1e-6)
    assert balance.per_flask_carbonate(found) == pytest.approx(by_n0, rel=1e-6)
    for step in (0, 1):
        moved = ChargeBalance(SYSTEMS["khp-naoh"], Flask(truth.V0, truth.n))
        rows = slice(len(balance.pK) + step, len(balance.pK) + 2)
        moved._exponents[rows, 2] -= np.log(10) * h
        there = moved.at(truth.pH(V), chemistry, ln_gamma=ln_gamma).V
        expected = (there - found.V) / h
        assert balance.per_carbonic_pK(found, chemistry, step) == pytest.approx(
            expected, rel=1e-4, abs=1e-6
        )


def test_effective_volume_is_where_carbonate_stands_as_hydrogencarbonate(usual):
    # with 1.4 % carbonate the inflection lies within 0.01 % of it, a colour change at pH 8.3 0.11 %
    # before and at 9.3 0.18 % past it (ideal solution, by hand: phthalate not yet neutralized
    # 10^(5.408 - 8.3), carbonate 0.014 * 10^(9.3 - 10.329), free hydroxide)
    truth = usual["khp-naoh"]
    truth.f, truth.activities = 0.014, False
    V = np.linspace(0.995, 1.005, 20001) * truth.effective_mL
    pH = truth.pH(V)
    steepest = V[np.argmax(np.gradient(pH, V))]
    assert steepest / truth.effective_mL - 1 == pytest.approx(0, abs=1e-4)
    before = np.interp(8.3, pH, V) / truth.effective_mL - 1
    past = np.interp(9.3, pH, V) / truth.effective_mL - 1
    assert 100 * before == pytest.approx(-0.11, abs=0.02)
    assert 100 * past == pytest.approx(0.18, abs=0.02)
