"""The answer's shape, every method on every known curve, and the reasons where one cannot."""

import json
from pathlib import Path

import numpy as np
import pytest

from server.curves.circumstances import Circumstances
from server.curves.entrance import analysed, equivalence
from server.curves.model.systems import SYSTEMS
from server.curves.outcome import METHODS, EndPoint
from server.curves.points import CurveProblem, Points

CURVES = json.loads(
    (Path(__file__).parents[1] / "reference" / "curves" / "simulated.json").read_text()
)["curves"]
SYSTEM = {"tris-hcl": "tris-hcl", "carbonate-hcl-two-steps": "carbonate-hcl"}


def points(name):
    set_ = CURVES[name]
    return Points(set_["kind"], tuple(set_["V"]), tuple(set_["y"]))


def answer(name, **more):
    set_ = CURVES[name]
    system = SYSTEM.get(name, "khp-naoh" if name.startswith("khp") else None)
    amount = set_.get("n_acid_mmol") or set_.get("n_base_mmol")
    given = {"system": system, "flask_volume_mL": set_.get("V0_mL"), "amount_mmol": amount}
    return equivalence(points(name), **{**given, **more})


def method(document, name):
    return next(one for one in document["methods"] if one["method"] == name)


@pytest.mark.parametrize("name", list(CURVES))
def test_answer_has_the_agreed_shape_and_survives_json(name):
    document = json.loads(json.dumps(answer(name)))
    assert document["format"] == "equivalence/1"
    assert document["points"] == len(CURVES[name]["V"])
    assert document["kind"] == CURVES[name]["kind"]
    assert [one["method"] for one in document["methods"]] == list(METHODS)
    for one in document["methods"]:
        if "unable" in one:
            assert one["unable"].endswith((".", "?"))
        else:
            assert one["u_mL"] > 0
            assert one["points_used"] == len(one["indices_used"]) >= 2
            assert one["says"]
    assert "unable" not in method(document, document["proposed"])
    for one in document["findings"]:
        assert one["verdict"] in {"holds", "look", "fails"}
        assert {"name", "figure", "limit", "basis", "says"} <= set(one)
    if document["fit"] is not None:
        assert {
            "effective_mL", "probe_slope", "probe_offset", "pK", "carbonate_fraction",
            "residual_rms", "down_weighted", "lag_s",
        } <= set(document["fit"])  # fmt: skip


@pytest.mark.parametrize("name", list(CURVES))
@pytest.mark.parametrize("way", ["first derivative", "second derivative"])
def test_derivatives_of_a_known_curve_find_the_equivalence(name, way):
    within = {"khp-probe-lag": 0.06, "khp-sparse-14-points": 0.25}.get(name, 0.035)
    found = method(answer(name), way)
    assert found["volume_mL"] == pytest.approx(CURVES[name]["equivalence_mL"], abs=within)


@pytest.mark.parametrize("name", [one for one in CURVES if one != "khp-probe-lag"])
def test_every_method_of_a_known_curve_covers_the_equivalence(name):
    for found in answer(name)["methods"]:
        if "unable" not in found:
            off = abs(found["volume_mL"] - CURVES[name]["equivalence_mL"])
            assert off < 2.5 * found["u_mL"], found["method"]


def test_direction_is_told():
    assert answer("khp-drop-counter")["direction"] == "rising"
    assert answer("tris-hcl")["direction"] == "falling"


def test_two_steps_both_are_answered():
    document = answer("carbonate-hcl-two-steps")
    first = CURVES["carbonate-hcl-two-steps"]["first_equivalence_mL"]
    others = {one["method"]: one for one in document["other_step"]}
    assert others["model fit"]["volume_mL"] == pytest.approx(first, rel=6e-4)
    for one in others.values():
        assert abs(one["volume_mL"] - first) < 2.5 * one["u_mL"]


def test_two_steps_without_a_system_are_still_two():
    document = answer("carbonate-hcl-two-steps", system="none")
    assert method(document, "first derivative")["volume_mL"] == pytest.approx(18.979, abs=0.035)
    assert document["other_step"][1]["volume_mL"] == pytest.approx(9.49, abs=0.05)


def test_carbonate_with_a_drowned_second_jump_is_still_looked_for(titration):
    truth = titration("carbonate-hcl", 50.0, 1.0, 0.1)
    V = np.concatenate([np.arange(0, 19, 0.5), np.arange(19, 24, 0.05)])
    y = truth.pH(V) + np.random.default_rng(1).normal(0, 0.03, V.size)
    document = equivalence(
        Points("pH", tuple(V), tuple(y)),
        system="carbonate-hcl", flask_volume_mL=50.0, amount_mmol=1.0,
    )  # fmt: skip
    assert method(document, "model fit")["volume_mL"] == pytest.approx(20.0, rel=2e-3)


@pytest.mark.parametrize(
    ("more", "says"),
    [
        ({"system": "none"}, "No acid-base system was named"),
        ({"flask_volume_mL": None}, "needs the volume in the flask"),
        ({"amount_mmol": None}, "needs the amount of standard"),
        ({"flask_volume_mL": None, "amount_mmol": None}, "flask and the amount"),
        ({"system": "tris-hcl"}, "The curve rises; that of TRIS"),
    ],
)
def test_model_fit_that_cannot_be_made_says_why(more, says):
    document = answer("khp-manual-burette", **more)
    assert says in method(document, "model fit")["unable"]
    assert document["fit"] is None
    assert document["proposed"] == "first derivative"


def test_gran_on_mV_of_an_unknown_reaction_says_why():
    document = answer("agno3-nacl-mV")
    assert "the reaction is not known" in method(document, "gran acid side")["unable"]


def test_model_fit_of_mV_from_a_pH_electrode_is_that_of_pH():
    set_ = CURVES["khp-manual-burette"]
    in_mV = tuple(59.159 * (7 - y) for y in set_["y"])
    document = equivalence(
        Points("mV", tuple(set_["V"]), in_mV),
        system="khp-naoh", flask_volume_mL=set_["V0_mL"], amount_mmol=set_["n_acid_mmol"],
    )  # fmt: skip
    same = method(answer("khp-manual-burette"), "model fit")
    assert method(document, "model fit")["volume_mL"] == pytest.approx(same["volume_mL"], abs=2e-5)
    assert document["direction"] == "falling"


def test_wrong_amount_shows_in_the_findings():
    set_ = CURVES["khp-manual-burette"]
    document = answer("khp-manual-burette", amount_mmol=1.5 * set_["n_acid_mmol"])
    assert any(one["verdict"] != "holds" for one in document["findings"])


@pytest.mark.parametrize(
    ("more", "says"),
    [
        ({"system": "vinegar"}, "No system 'vinegar' is known; there are: khp-naoh"),
        ({"flask_volume_mL": -5.0}, "flask_volume_mL must be above zero, not -5"),
        ({"amount_mmol": float("nan")}, "amount_mmol must be above zero"),
        ({"temperature_C": 80.0}, "temperature_C must lie between 0 and 50, not at 80"),
    ],
)
def test_circumstances_that_cannot_be_are_refused_by_name(more, says):
    with pytest.raises(CurveProblem) as caught:
        answer("khp-manual-burette", **more)
    assert says in caught.value.says


def by_drops(end_mL, rng):
    """One drop of 0.05 mL after the other, as a drop counter gives them."""
    return np.round(np.arange(0, 1.22 * end_mL, 0.05) + 0.0125 * int(rng.integers(4)), 4)


@pytest.mark.slow
@pytest.mark.parametrize("name", list(SYSTEMS))
@pytest.mark.parametrize(
    ("noise", "spacing"), [(0.005, "by hand"), (0.02, "by hand"), (0.01, "by drops")]
)
def test_every_method_covers_over_noisy_repeats(name, noise, spacing, usual, volumes_by_hand):
    truth = usual[name]
    rng = np.random.default_rng(21)
    known = Circumstances(system=SYSTEMS[name], flask_volume_mL=truth.V0, amount_mmol=truth.n)
    volumes = {"by hand": volumes_by_hand, "by drops": by_drops}[spacing]
    covered = {one: [] for one in METHODS}
    for _ in range(200):
        V = volumes(truth.effective_mL, rng)
        y = np.round(truth.pH(V) + rng.normal(0, noise, V.size), 3)
        for found in analysed(Points("pH", tuple(V), tuple(y)), known).outcomes:
            if isinstance(found, EndPoint):
                off = abs(found.volume_mL - truth.effective_mL)
                covered[found.method].append(off <= 2.5 * found.u_mL)
    for one, hits in covered.items():
        assert len(hits) >= 190, one
        assert np.mean(hits) >= 0.9, (one, np.mean(hits))


def _anything(rng):
    """Points of any kind, most of them no titration."""
    n = int(rng.integers(6, 60))
    V = np.cumsum(rng.choice([0, 0.01, 0.05, 0.5, 1.0, 3.0], n))
    y = [
        rng.normal(7, 3, n),
        np.linspace(3, 11, n),
        np.where(np.arange(n) < n // 2, 4.0, 10.0),
        np.sort(rng.uniform(2, 12, n))[::-1],
        np.sort(rng.uniform(2, 12, n)),
        np.where(np.arange(n) == n - 1, 9.0, 4.0),
        rng.normal(0, 1e6, n),
        7 + np.arcsinh((V - V.mean()) * rng.uniform(0.1, 50)),
    ][int(rng.integers(8))]
    seconds = tuple(np.cumsum(rng.choice([0, 1.0, 5.0], n))) if rng.random() < 0.3 else None
    kind = "pH" if rng.random() < 0.7 else "mV"
    return Points(kind, tuple(V), tuple(np.round(y, 2)), seconds)


@pytest.mark.parametrize("seed", range(20))
def test_points_of_any_kind_are_answered_or_refused_in_words(seed):
    rng = np.random.default_rng(seed)
    for _ in range(20):
        given = {
            "system": str(rng.choice([*SYSTEMS, "none"])),
            "flask_volume_mL": float(rng.choice([0.5, 50, 500])),
            "amount_mmol": float(rng.choice([1e-3, 2, 50])),
            "temperature_C": float(rng.choice([0, 25, 50])),
        }
        try:
            document = equivalence(_anything(rng), **given)
        except CurveProblem as problem:
            document = {"refused": problem.says}
        json.dumps(document, allow_nan=False)
        assert "methods" in document or document["refused"].endswith(".")
