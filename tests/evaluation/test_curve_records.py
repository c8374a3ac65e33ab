"""Bench records whose volumes are end points on curves: values, uncertainties, refusals."""

import copy
import math

import pytest

from server.curves.entrance import equivalence
from server.curves.outcome import METHODS
from server.curves.points import Points
from server.evaluation.bench_record import RecordProblem
from server.evaluation.entrance import evaluate, running_values

KHP = "khp-manual-burette"


def finding(result, name):
    return next(one for one in result["findings"] if one["name"] == name)


def budget(result, source):
    return next((one for one in result["budget"] if one["source"] == source), None)


@pytest.mark.parametrize(
    ("name", "system", "within"),
    [
        # the limits are those that the simulated curves were made for: 0.03 and 0.06 %
        ("khp-manual-burette", "khp-naoh", 3e-4),
        ("khp-carbonate-in-titrant", "khp-naoh", 3e-4),
        ("khp-drop-counter", "khp-naoh", 6e-4),
        ("khp-probe-96pct-slope-offset", "khp-naoh", 6e-4),
        ("khp-spikes", "khp-naoh", 6e-4),
        ("tris-hcl", "tris-hcl", 3e-4),
        ("carbonate-hcl-two-steps", "carbonate-hcl", 6e-4),
    ],
)
def test_record_with_curves_gives_the_concentration_that_they_were_made_with(
    curve_records, name, system, within
):
    curve = curve_records.curves[name]
    n = curve.get("n_acid_mmol") or curve["n_base_mmol"]
    ratio = 2 if system == "carbonate-hcl" else 1
    found = evaluate(curve_records.record(name, method="model fit"))
    expected = ratio * n / curve["equivalence_mL"]
    assert found["concentration"]["value"] == pytest.approx(expected, rel=within)
    assert abs(found["concentration"]["value"] - expected) < 3 * found["concentration"]["u"]
    assert {one["system"] for one in found["methods"]} == {system}
    assert {one["taken"] for one in found["methods"]} == {"model fit"}
    assert finding(found, "end point")["verdict"] == "holds"


def test_record_with_mV_curves_takes_a_derivative(curve_records):
    curve = curve_records.curves["fe-ce-redox-mV"]
    found = evaluate(curve_records.redox())
    expected = curve["n_mmol"] / curve["equivalence_mL"]
    # 0.035 mL is what the derivative methods are held to on the simulated curves
    assert found["concentration"]["value"] == pytest.approx(
        expected, rel=0.035 / curve["equivalence_mL"]
    )
    assert found["methods"][0]["kind"] == "mV"
    assert found["methods"][0]["fit"] is None
    assert "model fit" not in found["methods"][0]["values"]
    assert finding(found, "end point")["verdict"] == "look"
    assert "Nobody named a method" in finding(found, "end point")["says"]


def test_u_of_a_curve_record_agrees_with_gtc(curve_records):
    # GTC (Guide to the Expression of Uncertainty in Measurement by software of MSL New Zealand)
    import GTC

    record = curve_records.record(
        KHP,
        method="model fit",
        balance={"linearity": {"unit": "g", "u": "0.00012"}, "buoyancy": False},
        burette={"delivery": {"unit": "mL", "u": "0.008"}},
        temperature={"value": "23.0", "unit": "Cel", "u": "0.4"},
        liquid_expansion={"value": "0.00021", "unit": "1/K", "u": "0.00002"},
    )
    found = evaluate(record)
    held = found["methods"]
    c0 = [one["value"] for one in found["replicates"]]
    n, mean = len(c0), sum(c0) / len(c0)
    s = math.sqrt(sum((one - mean) ** 2 for one in c0) / (n - 1))
    w = GTC.ureal(1.0, 0.0002)
    linearity = GTC.ureal(0.0, math.sqrt(2) * 0.00012)
    delivery = GTC.ureal(0.0, 0.008)
    t = GTC.ureal(23.0, 0.4)
    beta = GTC.ureal(0.00021, 0.00002)
    shared = GTC.ureal(0.0, sum(one["u_shared_mL"] for one in held) / n)
    repeat = GTC.ureal(1.0, s / mean / math.sqrt(n), n - 1)
    values = [
        1000 * (float(row["mass"]) + linearity) * w / 204.2212
        / ((one["volume_mL"] + delivery + shared) * (1 + (0 - beta) * (t - 20)))
        for row, one in zip(record["replicates"], held, strict=True)
    ]  # fmt: skip
    c = sum(values) / n * repeat
    assert found["concentration"]["value"] == pytest.approx(c.x, rel=1e-12)
    assert found["concentration"]["u"] == pytest.approx(c.u, rel=1e-9)
    assert found["concentration"]["dof"] == pytest.approx(c.df, rel=1e-6)


def test_end_point_stands_in_the_budget_once_and_names_its_method(curve_records):
    found = evaluate(curve_records.record(KHP, method="model fit"))
    line = budget(found, "end point")
    shared = [one["u_shared_mL"] for one in found["methods"]]
    assert line["id"] == "end point: model fit, khp-naoh"
    assert line["unit"] == "mL"
    assert line["shared"] is True
    assert line["u"] == pytest.approx(sum(shared) / 3)
    assert budget(found, "end point, scatter of each curve's own points") is None
    assert sum(one["share_percent"] for one in found["budget"]) == pytest.approx(100.0)
    component = next(one for one in found["components"] if one["id"] == line["id"])
    assert abs(component["relative"]) == pytest.approx(
        line["contribution"] / found["concentration"]["value"]
    )


def test_end_point_by_a_derivative_brings_all_of_its_u_as_shared(curve_records):
    found = evaluate(curve_records.record(KHP, method="first derivative"))
    answers = [
        next(a for a in one["methods"] if a["method"] == "first derivative")
        for one in found["methods"]
    ]
    line = budget(found, "end point")
    assert line["id"] == "end point: first derivative"
    assert line["u"] == pytest.approx(sum(one["u_mL"] for one in answers) / 3)


@pytest.mark.parametrize("replicates", [1, 3])
def test_fits_own_scatter_counts_where_the_replicates_do_not_tell_it(curve_records, replicates):
    stated = {"relative_u": "0.0003", "dof": "20"}
    found = evaluate(
        curve_records.record(KHP, replicates=replicates, method="model fit", repeatability=stated)
    )
    line = budget(found, "end point, scatter of each curve's own points")
    own = [one["u_own_mL"] for one in found["methods"]]
    assert line["shared"] is False
    assert line["u"] == pytest.approx(math.sqrt(sum(one**2 for one in own)) / replicates)


def test_one_curve_alone_tells_nothing_about_its_repeatability(curve_records):
    with pytest.raises(RecordProblem, match="repeatability"):
        evaluate(curve_records.record(KHP, replicates=1, method="model fit"))


def test_methods_give_the_concentration_of_every_method_that_answers(curve_records):
    record = curve_records.record(KHP, method="model fit")
    found = evaluate(record)
    assert [one["label"] for one in found["methods"]] == ["1", "2", "3"]
    for one, row, read in zip(
        found["methods"], found["replicates"], record["replicates"], strict=True
    ):
        assert one["values"]["model fit"] == row["value"]
        assert set(one["values"]) <= set(METHODS)
        for answer in one["methods"]:
            expected = 1000 * float(read["mass"]) / 204.2212 / answer["volume_mL"]
            assert one["values"][answer["method"]] == pytest.approx(expected, rel=1e-9)


def test_methods_of_a_record_are_those_of_the_equivalence_verb(curve_records):
    record = curve_records.record(KHP, method="model fit")
    found = evaluate(record)["methods"][0]
    read = record["replicates"][0]
    alone = equivalence(
        Points(
            "pH",
            tuple(map(float, read["curve"]["volume_mL"])),
            tuple(map(float, read["curve"]["pH"])),
        ),
        system="khp-naoh",
        flask_volume_mL=50.0,
        amount_mmol=1000 * float(read["mass"]) / 204.2212,
        temperature_C=25.0,
    )
    for key in ("methods", "fit", "findings", "proposed"):
        assert found[key] == alone[key]


def test_error_table_and_expansion_apply_from_zero_to_the_end_point(curve_records):
    plain = evaluate(curve_records.record(KHP, method="model fit"))
    moved = evaluate(
        curve_records.record(
            KHP,
            method="model fit",
            burette={
                "capacity": {"value": "50", "unit": "mL"},
                "error_table": [["0", "0.010"], ["50", "0.060"]],
            },
            liquid_expansion={"value": "0.0004", "unit": "1/K"},
        )
    )
    read = plain["methods"][0]["volume_mL"]
    expected = (read + 0.05 * read / 50) * (1 - 0.0004 * 5)
    assert moved["replicates"][0]["volume_mL"] == pytest.approx(expected, rel=1e-12)


def test_drops_counted_share_the_volume_of_a_drop_and_leave_the_burette_out(curve_records):
    drop = {"value": "0.0500", "unit": "mL", "u": "0.0001", "id": "drop counter 2"}
    record = curve_records.record(
        KHP, method="model fit", burette={"delivery": {"unit": "mL", "u": "0.02"}}
    )
    for one in record["replicates"]:
        one["curve"]["drop"] = drop
    found = evaluate(record)
    line = budget(found, "volume of a drop")
    assert line["id"] == "drop counter 2"
    assert line["contribution"] == pytest.approx(0.002 * found["concentration"]["value"], rel=1e-3)
    assert budget(found, "burette")["contribution"] == 0.0


def test_excluded_replicate_with_a_curve_is_shown_and_does_not_count(curve_records):
    record = curve_records.record(KHP, replicates=4, method="model fit")
    record["replicates"][3]["excluded"] = "spilled"
    record["replicates"][3]["mass"] = "0.4300"
    found = evaluate(record)
    three = evaluate(curve_records.record(KHP, replicates=3, method="model fit"))
    assert found["concentration"] == three["concentration"]
    assert found["methods"][3]["excluded"] == "spilled"
    assert found["replicates"][3]["value"] == found["methods"][3]["values"]["model fit"]
    assert found["with_excluded"]["spread"]["n"] == 4


@pytest.mark.parametrize(
    "curve",
    [
        {"volume_mL": ["0", "1"], "pH": ["4", "5"]},
        {"volume_mL": ["0", "1", "2", "3", "2", "5", "6"], "pH": list("4455678")},
        {"volume_mL": [str(i) for i in range(9)], "pH": ["4"] * 9},
    ],
)
def test_excluded_replicate_with_a_curve_that_is_none_keeps_the_others(curve_records, curve):
    record = curve_records.record(KHP, method="model fit")
    record["replicates"].append({"mass": "0.4254", "curve": curve, "excluded": "probe fell out"})
    found = evaluate(record)
    assert found["spread"]["n"] == 3
    assert len(found["methods"]) == 3
    assert found["replicates"][3]["value"] is None
    assert "with_excluded" not in found or found["with_excluded"]["spread"]["n"] == 3


def test_replicates_method_goes_before_the_records_and_is_told(curve_records):
    record = curve_records.record(KHP, method="model fit")
    record["replicates"][1]["method"] = "second derivative"
    found = evaluate(record)
    assert [one["taken"] for one in found["methods"]] == [
        "model fit", "second derivative", "model fit",
    ]  # fmt: skip
    told = finding(found, "end point")
    assert told["verdict"] == "look"
    assert "replicate 2 took another" in told["says"]
    assert budget(found, "end point")["id"] == "end point: model fit, second derivative, khp-naoh"


def test_method_without_an_answer_is_refused_with_what_can(curve_records):
    record = curve_records.record(KHP, method="model fit")
    record["end_point"]["system"] = "tris-hcl"
    with pytest.raises(RecordProblem) as caught:
        evaluate(record)
    assert caught.value.path == "end_point.method"
    assert "Replicate 1: the model fit has no answer" in caught.value.says
    assert "The curve rises; that of TRIS" in caught.value.says
    assert "first derivative" in caught.value.says
    record["replicates"][0]["method"] = "model fit"
    with pytest.raises(RecordProblem) as caught:
        evaluate(record)
    assert caught.value.path == "replicates[0].method"


def test_fit_without_the_flasks_volume_says_so_and_widens_u(curve_records):
    curve = curve_records.curves[KHP]
    record = curve_records.record(KHP, end_point={"method": "model fit"})
    stated = evaluate(curve_records.record(KHP, method="model fit"))
    found = evaluate(record)
    assert [one["flask_assumed"] for one in found["methods"]] == [True] * 3
    assert found["concentration"]["value"] == pytest.approx(
        curve["n_acid_mmol"] / curve["equivalence_mL"], rel=3e-4
    )
    assert found["methods"][0]["u_shared_mL"] > 1.2 * stated["methods"][0]["u_shared_mL"]
    told = finding(found, "end point")
    assert told["verdict"] == "look"
    assert "volume in the flask is not stated" in told["says"]


def test_nobody_asks_for_the_fit_and_the_flask_is_not_stated_then_a_derivative(curve_records):
    found = evaluate(curve_records.record(KHP, end_point=None))
    assert {one["taken"] for one in found["methods"]} == {"first derivative"}
    answers = {one["method"]: one.get("unable") for one in found["methods"][0]["methods"]}
    assert "volume in the flask" in answers["model fit"]


@pytest.mark.parametrize("name", ["tris-hcl", "carbonate-hcl-two-steps", "khp-drop-counter"])
def test_fit_with_an_assumed_flask_stays_within_its_u(curve_records, name):
    curve = curve_records.curves[name]
    found = evaluate(curve_records.record(name, end_point={"method": "model fit"}))
    for one in found["methods"]:
        u = math.hypot(one["u_shared_mL"], one["u_own_mL"])
        assert abs(one["volume_mL"] - curve["equivalence_mL"]) < 2.5 * u


def test_stated_system_goes_before_titrant_and_standard(curve_records):
    found = evaluate(curve_records.record(KHP, end_point={"system": "none"}))
    assert found["methods"][0]["system"] == "none"
    unable = {one["method"]: one.get("unable", "") for one in found["methods"][0]["methods"]}
    assert "No acid-base system" in unable["model fit"]


def test_reagent_blank_is_not_taken_off_a_fit_that_counts_the_waters_carbonate(curve_records):
    blank = {"value": "0.030", "unit": "mL", "kind": "reagent", "u": "0.005"}
    with_it, without = (
        evaluate(curve_records.record(KHP, method="model fit", **more))
        for more in ({"blank": blank}, {})
    )
    assert with_it["concentration"]["value"] == without["concentration"]["value"]
    told = finding(with_it, "blank")
    assert told["verdict"] == "look"
    assert "counted twice" in told["says"]
    assert budget(with_it, "reagent blank")["contribution"] == 0.0


@pytest.mark.parametrize(("name", "method"), [(KHP, "first derivative"), ("tris-hcl", "model fit")])
def test_reagent_blank_is_taken_off_every_other_end_point(curve_records, name, method):
    blank = {"value": "0.030", "unit": "mL", "kind": "reagent"}
    with_it = evaluate(curve_records.record(name, method=method, blank=blank))
    without = evaluate(curve_records.record(name, method=method))
    off = without["replicates"][0]["volume_mL"] - with_it["replicates"][0]["volume_mL"]
    assert off == pytest.approx(0.030)
    assert finding(with_it, "blank")["verdict"] == "holds"


def test_curve_finding_tells_the_worst_and_whose(curve_records):
    record = curve_records.record(KHP, method="first derivative")
    record["replicates"][1] = curve_records.replicate("khp-probe-lag", seed=1)
    told = finding(evaluate(record), "curve")
    assert told["verdict"] == "fails"
    assert told["says"].startswith("Replicate 2, lag:")
    assert told["figure"] >= 1


def test_probe_finding_sets_the_fit_beside_the_buffers(curve_records):
    from server.evaluation.circumstances import Circumstances, Probe

    record = curve_records.record("khp-probe-96pct-slope-offset", method="model fit")
    alone = finding(evaluate(record), "probe")
    assert "96.0 %" in alone["says"]
    assert "No buffer calibration" in alone["says"]
    around = Circumstances(probe=Probe(slope_percent=97.5, offset_mV=-3.0))
    beside = finding(evaluate(record, circumstances=around), "probe")
    assert beside["figure"] == 97.5
    assert "97.5 % of Nernst" in beside["says"]
    assert "96.0 %" in beside["says"]


def broken(record, change):
    changed = copy.deepcopy(record)
    change(changed["replicates"][1])
    return changed


def shortened(one, count):
    one["curve"] = {key: values[:count] for key, values in one["curve"].items()}


def put(key, at, value):
    def change(one):
        one["curve"][key][at] = value

    return change


@pytest.mark.parametrize(
    ("change", "path", "says"),
    [
        (lambda one: shortened(one, 5), "curve.volume_mL", "at least 6 points"),
        (put("volume_mL", 7, "3.00"), "curve.volume_mL[7]", "goes back at point 8"),
        (put("volume_mL", 7, "x"), "curve.volume_mL[7]", "not a decimal number"),
        (put("pH", 3, None), "curve.pH[3]", "Write the number as text"),
        (put("pH", 3, float("nan")), "curve.pH[3]", "is no reading"),
        (put("pH", 3, 10**400), "curve.pH[3]", "is no reading"),
        (put("pH", 3, "44"), "curve.pH[3]", "between -5 and 20 pH"),
        (put("volume_mL", 0, "-1"), "curve.volume_mL[0]", "between 0 and 10000 mL"),
        (lambda one: one["curve"].update(mV=["1"]), "curve.pH", "in pH or in mV"),
        (lambda one: one["curve"]["pH"].pop(), "curve.pH", "values for"),
        (lambda one: one["curve"].update(seconds=["1"]), "curve.seconds", "values for"),
        (lambda one: one["curve"].update(colour=["1"]), "curve.colour", "not known here"),
        (lambda one: one.update(curve=[]), "curve", "must be an object"),
        (lambda one: one.update(method="by eye"), "method", "is none of"),
        (lambda one: one.update(delivered="20.00"), "curve", "keep one"),
        (
            lambda one: one["curve"].update(pH=["7.00"] * len(one["curve"]["pH"])),
            "curve.pH",
            "All readings are the same",
        ),
    ],
)
def test_curve_that_is_none_is_refused_by_its_path(curve_records, change, path, says):
    record = broken(curve_records.record(KHP, method="model fit"), change)
    with pytest.raises(RecordProblem) as caught:
        evaluate(record)
    assert caught.value.path == f"replicates[1].{path}"
    assert says in caught.value.says


@pytest.mark.parametrize(
    ("asked", "path"),
    [
        ({"method": "by eye"}, "end_point.method"),
        ({"system": "hcl-naoh"}, "end_point.system"),
        ({"flask_volume": {"value": "0", "unit": "mL"}}, "end_point.flask_volume.value"),
        ({"flask_volume": "50"}, "end_point.flask_volume"),
        ({"colour": "pink"}, "end_point.colour"),
        ("model fit", "end_point"),
    ],
)
def test_end_point_that_cannot_be_asked_is_refused_by_its_path(curve_records, asked, path):
    with pytest.raises(RecordProblem) as caught:
        evaluate(curve_records.record(KHP, end_point=asked))
    assert caught.value.path == path


def test_end_point_beyond_the_burette_is_refused(curve_records):
    small = {"capacity": {"value": "20", "unit": "mL"}}
    with pytest.raises(RecordProblem, match="more than the burette holds"):
        evaluate(curve_records.record(KHP, method="model fit", burette=small))
    table = {"error_table": [["1", "0"], ["50", "0.01"]]}
    with pytest.raises(RecordProblem, match="error table"):
        evaluate(curve_records.record(KHP, method="model fit", burette=table))


def test_running_value_of_a_curve_is_there_as_soon_as_the_replicate_is(curve_records):
    record = curve_records.record(KHP, method="model fit")
    del record["replicates"][1]["mass"]
    record["replicates"][2]["curve"]["pH"] = record["replicates"][2]["curve"]["pH"][:4]
    record["replicates"][2]["curve"]["volume_mL"] = ["0", "1", "2", "3"]
    found = running_values(record)
    whole = evaluate(curve_records.record(KHP, method="model fit"))
    assert found[0]["value"] == whole["replicates"][0]["value"]
    assert found[1]["value"] is None
    assert "mass" in found[1]["says"]
    assert "at least 6 points" in found[2]["says"]


def test_curve_record_is_confirmed_by_monte_carlo(curve_records):
    found = evaluate(curve_records.record(KHP, method="model fit"), trials=20_000)
    assert found["monte_carlo"]["first_order_validated"] is True
    assert found["monte_carlo"]["value"] == pytest.approx(
        found["concentration"]["value"], abs=0.05 * found["concentration"]["u"]
    )


def test_indicator_blank_on_a_curve_fails_and_is_taken_off_as_the_record_says(curve_records):
    blank = {"value": "0.030", "unit": "mL", "kind": "indicator"}
    with_it = evaluate(curve_records.record(KHP, method="model fit", blank=blank))
    without = evaluate(curve_records.record(KHP, method="model fit"))
    off = without["replicates"][0]["volume_mL"] - with_it["replicates"][0]["volume_mL"]
    assert off == pytest.approx(0.030)
    assert finding(with_it, "blank")["verdict"] == "fails"


def test_mV_curve_of_a_known_system_is_fitted_and_its_slope_set_beside_the_buffers(curve_records):
    from server.evaluation.circumstances import Circumstances, Probe

    # Nernst slope at 25 Cel, 59.16 mV per pH (textbook value), here 97 % of it and 6 mV off
    record = curve_records.record(KHP, method="model fit")
    for one in record["replicates"]:
        read = [float(pH) for pH in one["curve"].pop("pH")]
        one["curve"]["mV"] = [f"{6 - 0.97 * 59.16 * (pH - 7):.1f}" for pH in read]
    curve = curve_records.curves[KHP]
    around = Circumstances(probe=Probe(slope_percent=99.5, offset_mV=6.0))
    found = evaluate(record, circumstances=around)
    expected = curve["n_acid_mmol"] / curve["equivalence_mL"]
    assert found["concentration"]["value"] == pytest.approx(expected, rel=3e-4)
    told = finding(found, "probe")
    assert told["verdict"] == "look"
    assert "% of the ideal one" in told["says"]
    assert "from what the buffers gave" in told["says"]
    assert 100 * found["methods"][0]["fit"]["probe_slope"] == pytest.approx(97.0, abs=0.6)
