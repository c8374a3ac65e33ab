"""Volumetric ware: gravimetric runs, verdicts, what they state for use."""

import copy
import math

import pytest

from server.evaluation.entrance import evaluate
from server.lab.calibration.ware_verdict import class_statement, drop_volume, judge_ware
from server.lab.calibration.water_run import read_water_run
from server.lab.papers import read_calibration
from server.lab.refusal import Unacceptable
from server.metrology.conformity import GUARDED, SIMPLE
from server.metrology.gravimetry import Air, Ware, WaterWeighing, weighed_volume

AIR = {"temperature": "21.3", "pressure": "1003.1", "humidity": "46"}
BOUNDS = {
    "weighing": {"unit": "g", "half_width": "0.00015", "shape": "rectangular"},
    "water_temperature": {"unit": "Cel", "u": "0.1"},
    "air_temperature": {"unit": "Cel", "u": "0.3"},
    "air_pressure": {"unit": "hPa", "u": "1"},
    "air_humidity": {"unit": "%", "u": "3"},
}
Z = weighed_volume(
    WaterWeighing(1.0, 20.0, Air(21.3, 1003.1, 46.0)), Ware(9.9e-6, air_saturated=False)
).volume_mL  # mL per g of reading at 20 °C


def grams(volume_mL):
    """Return the net reading in g, as typed, that gives a volume at 20 °C."""
    return f"{volume_mL / Z:.7f}"


def a_run(volumes, **changed):
    run = {
        "kind": "pipette", "nominal": "10", "class": "A", "water": "degassed",
        "glass_expansion": "9.9e-6", "air": AIR, "uncertainty": BOUNDS,
        "weighings": [{"net": grams(one), "water": "20.0"} for one in volumes],
    }  # fmt: skip
    return run | changed


def around(volume, spread=0.002):
    """Return ten volumes of a mean, of which s is ``spread``·√(10/9)."""
    return [volume - spread, volume + spread] * 5


def named(outcome, name):
    return next(one for one in outcome.checks if one.name == name)


@pytest.mark.parametrize(
    ("volume", "verdict"),
    # ISO 648:2008, 10 mL class A: ± 0.02 mL
    [(10.0, "holds"), (10.01999, "holds"), (10.02001, "fails"), (9.98001, "holds"),
     (9.97999, "fails")],
)  # fmt: skip
def test_pipette_is_judged_at_its_class_limit(volume, verdict):
    outcome = judge_ware(read_water_run(a_run(around(volume, 0.0002))))
    check = named(outcome, "systematic error")
    assert check.verdict == verdict
    assert check.rule == SIMPLE
    assert "ISO 648:2008" in check.basis
    assert outcome.run.mean_mL == pytest.approx(volume, abs=2e-7)


def test_pipette_under_a_guard_band_is_looked_at_where_U_reaches_the_limit():
    outcome = judge_ware(read_water_run(a_run(around(10.0195), rule=GUARDED)))
    assert named(outcome, "systematic error").verdict == "look"
    assert named(outcome, "systematic error").rule == GUARDED
    assert judge_ware(read_water_run(a_run(around(10.01), rule=GUARDED))).verdict == "holds"


def test_every_weighing_shows_its_Z_and_a_left_out_one_keeps_its_row():
    run = a_run(around(10.0))
    run["weighings"].append({"net": "9.5", "water": "20.0", "left_out": "drop hung at the tip"})
    outcome = judge_ware(read_water_run(run))
    assert len(outcome.rows) == 11
    assert outcome.rows[-1].left_out == "drop hung at the tip"
    assert len(outcome.run.volumes) == 10
    # ISO 8655-6:2002, Table A.1 (checked against a copy): 1.0028 µL/mg at 20 °C, 100 kPa
    assert {f"{one.found.z_mL_g:.4f}" for one in outcome.rows} <= {"1.0028", "1.0029"}
    assert named(outcome, "weighings").verdict == "look"


def test_readings_before_and_after_are_corrected_by_the_balance():
    balance = {
        "linearity": {"unit": "g", "half_width": "0.00015", "shape": "rectangular"},
        "error_table": [["0", "0"], ["50", "0.0010"]],
        "error_u": {"unit": "g", "u": "0.0001"},
    }
    pairs = [{"before": "20.0000", "after": "30.0000", "water": "20.0"}] * 2
    bounds = {key: value for key, value in BOUNDS.items() if key != "weighing"}
    run = a_run([], weighings=pairs, balance=balance, uncertainty=bounds)
    outcome = judge_ware(read_water_run(run))
    # the correction is 0.0006 g at 30 g and 0.0004 g at 20 g
    assert outcome.rows[0].found.net_g == pytest.approx(10.0002)
    u = {line.name: line.u for line in outcome.run.budget}
    assert u["weighing"] == pytest.approx(math.sqrt(2) * 0.00015 / math.sqrt(3))
    assert u["balance_errors"] == pytest.approx(0.0001)
    assert named(outcome, "budget").verdict == "holds"


def test_unstated_uncertainties_are_named():
    outcome = judge_ware(read_water_run(a_run(around(10.0), uncertainty={})))
    check = named(outcome, "budget")
    assert check.verdict == "look"
    assert "temperature of the water" in check.says


def test_pipette_states_its_mean_with_u_for_a_bench_record():
    outcome = judge_ware(read_water_run(a_run(around(10.004))))
    delivery = outcome.document["delivery"]
    assert float(delivery["value"]) == pytest.approx(10.004, abs=1e-6)
    assert float(delivery["u"]) == pytest.approx(outcome.run.u_mL, abs=1e-9)
    assert outcome.document["glass_expansion"] == "9.9e-6"


def test_flask_states_the_spread_of_one_filling_as_well():
    run = a_run(around(100.02, 0.03), kind="flask", nominal="100")
    outcome = judge_ware(read_water_run(run))
    # ISO 1042:1998, 100 mL class A: ± 0.1 mL
    assert outcome.verdict in {"holds", "look"}
    s = 0.03 * math.sqrt(10 / 9)
    stated = float(outcome.document["volume"]["u"])
    assert stated == pytest.approx(math.hypot(outcome.run.u_mL, s), rel=1e-4)


@pytest.mark.parametrize(("spread", "verdict"), [(0.00284, "holds"), (0.00285, "fails")])
def test_piston_pipette_has_a_limit_for_the_random_error(spread, verdict):
    # ISO 8655-2:2002, 1000 µL: 8 µL systematic, 3 µL random; s = spread·√(10/9)
    run = a_run(around(1.0, spread), kind="piston pipette", nominal="1", glass_expansion="0")
    del run["class"]
    check = named(judge_ware(read_water_run(run)), "random error")
    assert check.verdict == verdict
    assert check.limit == 0.003


def test_evaporation_is_added_by_the_minutes_of_each_weighing():
    weighings = [{"net": grams(10.0), "water": "20.0"} for _ in range(10)]
    weighings[0]["minutes"] = "3"
    run = a_run([], weighings=weighings, evaporation={"rate": "0.0010", "minutes": "1"})
    outcome = judge_ware(read_water_run(run))
    lost = [one.found.evaporated_g for one in outcome.rows]
    assert lost == pytest.approx([0.003] + [0.001] * 9)
    assert outcome.rows[0].found.volume_mL == pytest.approx(10.0 + 0.003 * Z, abs=1e-6)
    assert "evaporation" in named(outcome, "budget").says


def burette(points, **changed):
    weighings = [{"net": grams(volume), "water": "20.0", "point": at} for at, volume in points]
    run = a_run([], kind="burette", nominal="20", weighings=weighings) | {"class": "A"}
    return run | changed


CURVE = [
    ("5.00", 5.006), ("5.00", 5.008), ("10.00", 10.011), ("10.00", 10.009),
    ("15.00", 14.998), ("15.00", 15.002), ("20.00", 19.991), ("20.00", 19.989),
]  # fmt: skip


def test_burette_run_becomes_a_calibration_that_papers_take(monkeypatch):
    # ISO 385 has no 20 mL burette: 25 mL with 0.05 mL divisions, class A ± 0.03 mL
    run = burette(CURVE, nominal="25", division="0.05")
    outcome = judge_ware(read_water_run(run))
    assert outcome.verdict == "holds"
    read = read_calibration("burette", outcome.document)
    assert read["error_table"][0] == ["0", "0"]
    assert [float(row[1]) for row in read["error_table"]] == pytest.approx(
        [0, 0.007, 0.010, 0, -0.010], abs=2e-7
    )
    assert float(read["delivery"]["u"]) == pytest.approx(outcome.curve.delivery_u_mL, abs=1e-9)


def test_burette_run_moves_a_standardization_by_its_table():
    calibration = judge_ware(read_water_run(burette(CURVE, nominal="25", division="0.05"))).document
    record = {
        "format": "bench-record/1",
        "titrant": {"substance": "NaOH", "nominal": {"value": "0.1", "unit": "mol/L"}},
        "route": "weighed",
        "standard": {"substance": "KHP", "mass_fraction": {"value": "1.0", "u": "0.0003"}},
        "balance": {"linearity": {"unit": "g", "u": "0.0001"}, "buoyancy": False},
        "burette": calibration,
        "repeatability": {"relative_u": "0.0005"},
        "replicates": [{"mass": "0.2042", "burette": [["0.00", "10.00"]]}],
    }
    bare = copy.deepcopy(record)
    del bare["burette"]["error_table"]
    with_table = evaluate(record)["replicates"][0]["volume_mL"]
    assert with_table == pytest.approx(10.010, abs=1e-6)
    assert evaluate(bare)["replicates"][0]["volume_mL"] == pytest.approx(10.0, abs=1e-9)


@pytest.mark.parametrize(
    ("top", "at_a_point", "between"),
    [(20.0299, "holds", "holds"), (20.0301, "fails", "fails")],
)
def test_burette_is_judged_at_every_point_and_between_points(top, at_a_point, between):
    points = [("10.00", 10.0), ("10.00", 10.0002), ("20.00", top), ("20.00", top)]
    run = burette(points, nominal="25", division="0.05")
    outcome = judge_ware(read_water_run(run))
    assert named(outcome, "error at a point").verdict == at_a_point
    assert named(outcome, "error between points").verdict == between


def test_burette_whose_points_differ_by_more_than_the_tolerance_fails_between_points():
    points = [("10.00", 10.02), ("10.00", 10.02), ("20.00", 19.98), ("20.00", 19.9801)]
    outcome = judge_ware(read_water_run(burette(points, nominal="25", division="0.05")))
    assert named(outcome, "error at a point").verdict == "holds"
    assert named(outcome, "error between points").verdict == "fails"


@pytest.mark.parametrize(("apart", "verdict"), [(0.0282, "holds"), (0.0284, "fails")])
def test_piston_burette_has_a_limit_for_the_random_error(apart, verdict):
    # ISO 8655-3:2002, 20 mL (from memory): 40 µL systematic, 20 µL random; s of a pair is d/√2
    points = [(at, float(at) + sign * apart / 2) for at in ("10", "20") for sign in (-1, 1)]
    run = burette(points, kind="piston burette")
    del run["class"]
    check = named(judge_ware(read_water_run(run)), "random error")
    assert check.verdict == verdict
    assert "from memory" in check.basis


def test_class_tolerance_serves_without_a_run_and_says_so():
    from decimal import Decimal

    stated = class_statement(
        "burette", Decimal(25), grade="A", division=Decimal("0.05"), glass_expansion="9.9e-6"
    )
    read = read_calibration("burette", stated)
    assert read["delivery"]["half_width"] == "0.03"
    assert read["delivery"]["shape"] == "triangular"
    assert "no gravimetric run" in read["delivery"]["source"]
    pipette = class_statement("pipette", Decimal(10), grade="B", shape="rectangular")
    assert pipette == {
        "delivery": {
            "value": "10", "unit": "mL", "half_width": "0.04", "shape": "rectangular",
            "source": "tolerance of ISO 648:2008 class B, 10 mL, no gravimetric run",
        }
    }  # fmt: skip


def test_drop_volume_is_that_of_one_of_many():
    run = read_water_run(a_run([1.0, 1.01, 0.99], nominal="1"))
    volume, u = drop_volume(run, 20)
    assert volume == pytest.approx(0.05, rel=1e-6)
    # s/√n over the drops, and the other lines of the budget above it
    least = 0.01 / math.sqrt(3) / 20
    assert least < u < 1.01 * least
    with pytest.raises(Unacceptable, match="drops"):
        drop_volume(run, 0)


@pytest.mark.parametrize(
    ("change", "field", "says"),
    [
        ({"colour": "blue"}, "colour", "not known"),
        ({"kind": "beaker"}, "kind", "one of"),
        ({"nominal": "0"}, "nominal", "must"),
        ({"nominal": "15"}, "nominal", "no pipette of 15"),
        ({"class": "AAA"}, "class", "one of"),
        ({"water": "tap"}, "water", "one of"),
        ({"air": {"temperature": "21"}}, "air.pressure", "missing"),
        ({"weighings": []}, "weighings", "1 to 200"),
        ({"weighings": [{"net": "9.97"}]}, "weighings[0].water", "missing"),
        ({"weighings": [{"net": "9.97", "water": "20,1"}]}, "weighings[0].water", "comma"),
        ({"weighings": [{"net": "9.97", "water": "51"}]}, "weighings[0].water", "between"),
        ({"weighings": [{"before": "9", "after": "8", "water": "20"}]}, "weighings[0].after",
         "nothing was delivered"),
        ({"weighings": [{"before": "9", "water": "20"}]}, "weighings[0].after", "missing"),
        ({"weighings": [{"net": "9.97", "before": "1", "water": "20"}]}, "weighings[0].net",
         "keep one"),
        ({"weighings": [{"net": "9.97", "water": "20", "point": "5"}]}, "weighings[0].point",
         "only a burette"),
        ({"weighings": [{"net": "9.97", "water": "20"}]}, "weighings", "two weighings"),
        ({"weighings": [{"net": 9.97, "water": "20"}] * 3}, "weighings[0].net", "as text"),
        ({"uncertainty": {"water_temperature": {"unit": "Cel", "value": "20", "u": "1"}}},
         "uncertainty.water_temperature", "no value"),
        ({"evaporation": {"minutes": "1"}}, "evaporation.rate", "missing"),
        ({"glass_expansion": "9.9"}, "glass_expansion", "between"),
        ({"rule": "by eye"}, "rule", "one of"),
    ],
)  # fmt: skip
def test_run_that_cannot_be_is_refused_by_its_place(change, field, says):
    with pytest.raises(Unacceptable, match=says) as caught:
        judge_ware(read_water_run(a_run(around(10.0)) | change))
    assert caught.value.field == field


def test_burette_point_outside_its_scale_is_refused():
    with pytest.raises(Unacceptable, match="within 20"):
        read_water_run(burette([("20.01", 20.0)]))
    with pytest.raises(Unacceptable, match="twice"):
        judge_ware(
            read_water_run(burette([("5", 5.0), ("10", 10.0)], nominal="25", division="0.05"))
        )
