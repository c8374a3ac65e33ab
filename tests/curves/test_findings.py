"""Findings say in words what the figures show."""

import json
from pathlib import Path

import numpy as np
import pytest

from server.curves.circumstances import Circumstances
from server.curves.entrance import analysed
from server.curves.model.systems import SYSTEMS
from server.curves.points import Points

CURVES = json.loads(
    (Path(__file__).parents[1] / "reference" / "curves" / "simulated.json").read_text()
)["curves"]


def findings_of(truth, V, y):
    known = Circumstances(
        system=SYSTEMS[truth.system], flask_volume_mL=truth.V0, amount_mmol=truth.n
    )
    found = analysed(Points("pH", tuple(V), tuple(y)), known)
    return {one.name: one for one in found.findings}


@pytest.fixture
def curve(usual, volumes_by_hand):
    truth = usual["khp-naoh"]
    V = volumes_by_hand(truth.effective_mL)
    return truth, V, truth.pH(V) + np.random.default_rng(1).normal(0, 0.01, V.size)


def test_findings_of_a_good_curve_all_hold(curve):
    found = findings_of(*curve)
    assert {name: one.verdict for name, one in found.items() if one.verdict != "holds"} == {}
    assert "the residuals show no pattern" in found["residuals"].says


def test_finding_residuals_that_go_together_are_said_and_enlarge_u(curve):
    truth, V, y = curve
    bent = y + 0.08 * np.sin(np.linspace(0, 12, V.size))
    found = findings_of(truth, V, bent)
    assert found["residuals"].verdict in {"look", "fails"}
    assert "neighbouring residuals go together" in found["residuals"].says
    assert "u was enlarged" in found["residuals"].says


def test_finding_noisy_probe_is_more_than_one_in_order(curve):
    truth, V, y = curve
    noisy = y + np.random.default_rng(2).normal(0, 0.08, V.size)
    assert findings_of(truth, V, noisy)["residuals"].verdict != "holds"


@pytest.mark.parametrize(
    ("slope", "offset", "verdict"),
    [
        (0.99, 0.05, "holds"),
        (0.93, 0.0, "look"),
        (0.86, 0.0, "fails"),
        (1.0, 0.3, "look"),
    ],
)
def test_finding_probe_follows_slope_and_offset(slope, offset, verdict, curve):
    truth, V, y = curve
    found = findings_of(truth, V, 7 + offset + slope * (y - 7))["probe"]
    assert found.verdict == verdict
    assert found.figure == pytest.approx(100 * slope, abs=1.0)


def test_finding_carbonate_is_told_apart_from_the_effective_concentration(
    titration, volumes_by_hand
):
    truth = titration("khp-naoh", 50.0, 2.0, 0.1, f=0.02)
    V = volumes_by_hand(truth.effective_mL)
    y = truth.pH(V) + np.random.default_rng(1).normal(0, 0.01, V.size)
    found = findings_of(truth, V, y)["carbonate"]
    assert found.verdict == "look"
    assert found.figure == pytest.approx(2.0, abs=0.15)
    assert "counts it to hydrogencarbonate" in found.says


def test_finding_bubbles_few_hold_and_many_are_looked_at(curve):
    truth, V, y = curve
    few, many = y.copy(), y.copy()
    few[7] += 1.0
    many[[4, 8, 12, 16, 50]] += 1.0
    assert findings_of(truth, V, few)["bubbles"].verdict == "holds"
    assert f"at {V[7]:g} mL" in findings_of(truth, V, few)["bubbles"].says
    assert findings_of(truth, V, many)["bubbles"].verdict == "look"


def test_finding_spacing_of_fourteen_points_asks_for_closer_ones():
    set_ = CURVES["khp-sparse-14-points"]
    found = analysed(Points("pH", tuple(set_["V"]), tuple(set_["y"])))
    assert found.findings[-1].name == "spacing"
    assert "closer ones" in found.findings[-1].says


def test_finding_pK_far_off_asks_whether_it_is_the_substance(titration, volumes_by_hand):
    truth = titration("khp-naoh", 50.0, 2.0, 0.1, pK_shift=-0.65)
    V = volumes_by_hand(truth.effective_mL)
    y = truth.pH(V) + np.random.default_rng(1).normal(0, 0.005, V.size)
    found = findings_of(truth, V, y)
    assert found["pK"].verdict != "holds" or found["probe"].verdict != "holds"


def test_finding_carbon_dioxide_is_said_for_carbonate_with_acid(usual, volumes_by_hand):
    truth = usual["carbonate-hcl"]
    V = volumes_by_hand(truth.effective_mL)
    y = truth.pH(V) + np.random.default_rng(1).normal(0, 0.01, V.size)
    found = findings_of(truth, V, y)
    assert "takes the flask as closed" in found["carbon dioxide"].says
    assert found["carbon dioxide"].verdict == "holds"


@pytest.mark.parametrize("short_mL", [0.1, 0.6, 1.0, 2.0])
def test_finding_of_points_that_end_before_the_end_point_fails(curve, short_mL):
    truth, V, y = curve
    read = truth.effective_mL - short_mL > V
    found = findings_of(truth, V[read], y[read])["end point"]
    assert found.verdict == "fails"
    assert "only the steepest of what was read" in found.says


def test_finding_of_points_that_end_in_the_jump_is_only_looked_at_where_the_fit_holds(curve):
    truth, V, y = curve
    read = truth.effective_mL + 0.06 > V
    found = findings_of(truth, V[read], y[read])["end point"]
    assert found.verdict == "look"
    assert "only the steepest" not in found.says


def test_finding_of_a_bump_of_noise_taken_for_the_end_point_fails():
    one = CURVES["khp-drop-counter"]
    read = [at for at, V in enumerate(one["V"]) if one["equivalence_mL"] - 1 > V]
    V, y = (tuple(one[key][at] for at in read) for key in ("V", "y"))
    known = Circumstances(SYSTEMS["khp-naoh"], one["V0_mL"], one["n_acid_mmol"])
    found = {note.name: note for note in analysed(Points("pH", V, y), known).findings}
    assert found["end point"].verdict == "fails"
