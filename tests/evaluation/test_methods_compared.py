"""Methods compared on real results: who is paired with whom, what is left out, and the u of it."""

import copy
import math

import numpy as np
import pytest

from server.evaluation.circumstances import Circumstances, LastCertificate, Limits
from server.evaluation.entrance import evaluate
from server.evaluation.methods_compared import (
    SheetOutcome,
    StatedValue,
    compare_sheets,
    last_certified,
)
from server.upkeep.bench.known_curve import KnownCurve, volumes_by_hand

INDICATOR = "indicator phenolphthalein"
COMMON = {
    "format": "bench-record/1",
    "titrant": {"substance": "NaOH", "nominal": {"value": "0.1", "unit": "mol/L"}},
    "route": "weighed",
    "standard": {
        "substance": "KHP",
        "mass_fraction": {"value": "0.9998", "u": "0.0003", "id": "lot K"},
    },
    "balance": {
        "linearity": {"half_width": "0.00015", "shape": "rectangular", "unit": "g"},
        "buoyancy": False,
    },
    "burette": {
        "capacity": {"value": "50", "unit": "mL"},
        "delivery": {"half_width": "0.03", "shape": "triangular", "unit": "mL", "id": "burette B"},
    },
}


def curve(seed, *, points=None, method=None):
    """2 mmol of phthalate titrated; 0.4085 g of it at w 0.9998 are 1.99990 mmol."""
    rng = np.random.default_rng(seed)
    V = np.round(volumes_by_hand(float(rng.uniform())), 2)[:points]
    y = KnownCurve(carbonate=0.003).pH(V) + rng.normal(0, 0.01, V.size)
    one = {
        "mass": "0.4085",
        "curve": {"volume_mL": [f"{v:.2f}" for v in V], "pH": [f"{p:.3f}" for p in y]},
    }
    return one | ({"method": method} if method else {})


def record(replicates, **more):
    labelled = [{"label": str(at), **one} for at, one in enumerate(replicates, 1)]
    return {**COMMON, "replicates": labelled, **more}


def by_curves(seeds, **more):
    end_point = {"method": "model fit", "flask_volume": {"value": "50", "unit": "mL"}}
    return evaluate(record([curve(seed) for seed in seeds], end_point=end_point, **more))


@pytest.fixture(scope="module")
def curves():
    return SheetOutcome("S-1", by_curves(range(4)), INDICATOR)


@pytest.fixture(scope="module")
def seen():
    drops = ["20.14", "20.13", "20.14", "20.13"]
    replicates = [{"mass": "0.4085", "burette": [["0.00", end]]} for end in drops]
    blank = {"kind": "indicator", "value": "0.03", "u": "0.01", "unit": "mL"}
    return SheetOutcome("S-2", evaluate(record(replicates, blank=blank)), INDICATOR)


def test_methods_of_one_sheet_read_the_same_curves_and_are_paired(curves):
    found = compare_sheets([curves], margin_percent=0.1)
    assert [one.method for one in found.groups] == [
        "steepest segment", "first derivative", "second derivative",
        "gran acid side", "gran alkaline side", "model fit",
    ]  # fmt: skip
    assert found.comparison.paired
    assert all(one.paired for one in found.comparison.pairs)
    assert found.taken == ("model fit",)
    fit = found.groups[-1]
    assert fit.values == tuple(one["value"] for one in curves.result["replicates"])
    assert found.comparison.margin_percent == 0.1


def test_indicator_of_another_sheet_is_unpaired_and_the_curves_stay_paired(curves, seen):
    found = compare_sheets([curves, seen], margin_percent=0.1)
    assert found.groups[-1].method == INDICATOR
    for pair in found.comparison.pairs:
        assert pair.paired == (INDICATOR not in {pair.first, pair.second})
    assert found.taken == ("model fit", INDICATOR)
    assert found.sheets == ("S-1", "S-2")


def test_indicator_and_fit_that_differ_by_little_are_told_by_the_margin(curves, seen):
    narrow, wide = (compare_sheets([curves, seen], margin_percent=m) for m in (0.05, 1.0))

    def said(found):
        return next(
            one.equality
            for one in found.comparison.pairs
            if {one.first, one.second} == {"model fit", INDICATOR}
        )

    assert said(narrow) == "different"
    assert said(wide) == "equal within the margin"


def test_proposed_is_the_method_whose_mean_is_least_uncertain(curves):
    # of the same flask and burette: the fit's model part is some µL, that of the others tens
    found = compare_sheets([curves], margin_percent=0.1)
    assert found.comparison.proposed == "model fit"
    own = {one.method: one.u_systematic for one in found.groups}
    assert min(own, key=own.get) == "model fit"
    first = curves.result["methods"][0]["fit"]["u_model_mL"]
    assert own["model fit"] == pytest.approx(first / 20 * 0.1, rel=0.1)


def test_excluded_replicate_is_left_out_here_too():
    replicates = [curve(seed) for seed in range(4)]
    replicates[1]["excluded"] = "spilled or lost"
    end_point = {"method": "first derivative"}
    result = evaluate(record(replicates, end_point=end_point))
    found = compare_sheets([SheetOutcome("S-3", result, INDICATOR)], margin_percent=0.1)
    assert {one.flasks for one in found.groups} == {("S-3 · 1", "S-3 · 3", "S-3 · 4")}


def test_method_without_an_answer_is_left_out_with_its_reason():
    # without the flask's volume neither the fit nor the line beyond the end point can be made
    result = evaluate(
        record([curve(seed) for seed in range(3)], end_point={"method": "first derivative"})
    )
    found = compare_sheets([SheetOutcome("S-4", result, INDICATOR)], margin_percent=0.1)
    reasons = {one.method: one.why for one in found.left_out}
    assert set(reasons) == {"model fit", "gran alkaline side"}
    assert "replicate 1" in reasons["model fit"]
    assert "volume in the flask" in reasons["model fit"]


def test_single_curve_is_no_comparison_and_says_so():
    result = by_curves([1], repeatability={"relative_u": "0.0005"})
    found = compare_sheets([SheetOutcome("S-5", result, INDICATOR)], margin_percent=0.1)
    assert found.comparison is None
    assert found.problem == "A comparison needs at least two methods."
    assert all("one value only" in one.why for one in found.left_out)


def test_last_certificate_is_the_reference_and_shared_roots_cancel(curves):
    last = LastCertificate("C-7", 0.09999, 5e-5, {"burette B": -6.1e-4, "lot K": 3e-4})
    known = SheetOutcome("S-1", curves.result, INDICATOR, Circumstances(last_certificate=last))
    reference = last_certified(known)
    assert (reference.name, reference.value) == ("certificate C-7", 0.09999)
    shared = compare_sheets([known], margin_percent=0.1, reference=reference)
    alone = StatedValue(0.09999, 5e-5, "another laboratory")
    apart = compare_sheets([known], margin_percent=0.1, reference=alone)
    u_shared, u_apart = (one.groups[-1].u_systematic for one in (shared, apart))
    # the burette's 0.03/√6 mL of 20 mL and the lot's 0.0003 are most of u
    assert u_shared < 0.7 * u_apart
    fit = next(one for one in apart.comparison.trueness if one.method == "model fit")
    scatter = apart.comparison.summaries[-1].s / math.sqrt(4)
    difference = apart.comparison.summaries[-1].mean - 0.09999
    assert fit.En == pytest.approx(abs(difference) / (2 * math.hypot(u_apart, scatter)))


def test_u_against_a_reference_is_the_results_own_with_the_methods_end_point(curves):
    # the fit was taken: but for the scatter, u of the difference is that of the result
    exact = StatedValue(0.1, 0.0, "a value without u")
    found = compare_sheets([curves], margin_percent=0.1, reference=exact)
    shared = sum(row["contribution"] ** 2 for row in curves.result["budget"] if row["shared"])
    assert found.groups[-1].u_systematic == pytest.approx(math.sqrt(shared), rel=0.02)
    steepest, fit = found.groups[0], found.groups[-1]
    assert steepest.u_systematic > fit.u_systematic


def test_indicators_own_part_is_that_of_blank_and_excess(seen):
    only = compare_sheets([seen], margin_percent=0.1)
    assert only.comparison is None
    blank = next(row for row in seen.result["budget"] if row["source"].endswith("blank"))
    assert only.groups[0].u_systematic == pytest.approx(blank["contribution"])


def test_value_that_a_method_cannot_give_in_this_burette_is_missing_from_its_flasks(curves):
    result = copy.deepcopy(curves.result)
    del result["methods"][2]["values"]["gran acid side"]
    found = compare_sheets([SheetOutcome("S-1", result, INDICATOR)], margin_percent=0.1)
    gran = next(one for one in found.groups if one.method == "gran acid side")
    assert len(gran.values) == 3
    pair = next(
        one for one in found.comparison.pairs if "gran acid side" in (one.first, one.second)
    )
    assert pair.paired


def test_sheet_without_a_certificate_before_it_has_no_reference(curves):
    assert last_certified(curves) is None
    assert curves.limits == Limits()
