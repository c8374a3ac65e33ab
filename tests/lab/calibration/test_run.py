"""A calibration done here: one door for every kind, with what the house's instruments state."""

import json
import math

import pytest

from server.lab.calibration.drop import judge_drop
from server.lab.calibration.preview import preview_run
from server.lab.calibration.run import KINDS, UsedInstrument, judge_run, with_instruments
from server.lab.calibration.told import read_told
from server.lab.papers import read_calibration
from server.lab.refusal import Unacceptable

AIR = {"temperature": "21.3", "pressure": "1003.1", "humidity": "46"}
PIPETTE = {
    "kind": "pipette", "nominal": "10", "class": "A", "water": "degassed",
    "glass_expansion": "9.9e-6", "air": AIR,
    "weighings": [
        {"before": "20.0000", "after": f"{29.97 + i / 1000:.4f}", "water": "20.0"}
        for i in range(10)
    ],
}  # fmt: skip
BURETTE = PIPETTE | {
    "kind": "piston burette", "nominal": "20",
    "weighings": [
        {"before": "20.0000", "after": f"{20 + at * 0.9972 + i / 1000:.4f}", "water": "20.0",
         "point": str(at)}
        for at in (5, 10, 15, 20) for i in range(2)
    ],
}  # fmt: skip
BALANCE = {
    "step": "0.0001",
    "weights": [
        {"nominal": "50", "conventional": "50.00002", "U": "0.0001", "k": "2", "up": "50.0002"},
        {"nominal": "200", "conventional": "199.9999", "U": "0.0003", "k": "2", "up": "200.0008"},
    ],
    "repeatability": {"readings": ["100.0004", "100.0005", "100.0004", "100.0003", "100.0005"]},
}  # fmt: skip
PROBE = {
    "set": "JIS Z 8802:2011",
    "buffers": [
        {"buffer": "phthalate", "temperature": "25", "mV": "176.9"},
        {"buffer": "phosphate", "temperature": "25", "mV": "8.3"},
    ],
}
THERMOMETER = {
    "step": "0.1",
    "points": [{"reading": "10.0", "reference": "9.95"}, {"reading": "30.0", "reference": "30.10"}],
    "reference_u": {"unit": "Cel", "U": "0.04", "k": "2"},
}
RUNS = {
    "pipette": PIPETTE, "burette": BURETTE, "balance": BALANCE, "probe": PROBE,
    "thermometer": THERMOMETER, "flask": PIPETTE | {"kind": "flask"},
}  # fmt: skip
HOUSE = (
    UsedInstrument("balance", "i1", "c1", "B-1", 3, "C-1", {
        "linearity": {"unit": "g", "half_width": "0.00015", "shape": "rectangular", "id": "x"},
        "error_table": [["0", "0"], ["50", "0.0010"]],
        "error_u": {"unit": "g", "u": "0.0001"},
    }),
    UsedInstrument("thermometer", "i2", "c2", "T-1", 1, "C-2", {
        "reading": {"unit": "Cel", "U": "0.2", "k": "2"},
        "error_table": [["10", "0"], ["30", "0.4"]],
    }),
    UsedInstrument("room monitor", "i3", "c3", "R-1", 1, "C-3", {
        "temperature": {"unit": "Cel", "u": "0.2"}, "pressure": {"unit": "hPa", "u": "0.5"},
        "humidity": {"unit": "%", "u": "2"},
    }),
)  # fmt: skip


@pytest.mark.parametrize("kind", RUNS)
def test_run_of_each_kind_becomes_a_calibration_that_papers_take(kind):
    judged = judge_run(kind, RUNS[kind])
    assert read_calibration(kind, judged.document) == judged.document
    assert judged.checks
    assert judged.verdict in {"holds", "look", "fails"}
    told = judged.told
    assert len(told.rows) == len(next(v for v in RUNS[kind].values() if isinstance(v, list)))
    assert {len(row) for row in told.rows} == {len(told.heads)}
    kept = json.loads(json.dumps(told.to_document()))
    assert read_told(kept) == told


def test_every_kind_that_is_calibrated_here_is_tried():
    assert set(KINDS) == set(RUNS)


def test_room_monitor_is_calibrated_elsewhere():
    with pytest.raises(Unacceptable, match="elsewhere"):
        judge_run("room monitor", {})


@pytest.mark.parametrize("document", [None, [], "x"])
def test_run_that_is_no_object_is_refused(document):
    with pytest.raises(Unacceptable) as refused:
        judge_run("pipette", document)
    assert refused.value.field == "run"


def test_ware_of_another_kind_is_refused():
    with pytest.raises(Unacceptable, match="this is a flask") as refused:
        judge_run("flask", PIPETTE)
    assert refused.value.field == "kind"


def test_balance_of_the_house_corrects_every_reading_and_bounds_the_budget():
    judged = judge_run("pipette", PIPETTE, HOUSE)
    nets = [float(row[2]) for row in judged.told.rows[:1]]
    assert judged.told.rows[0][2] == "9.9702"  # 29.97 + 0.0006 less 20 + 0.0004
    assert nets == [9.9702]
    u = {row[0]: row[1] for row in judged.told.budget}
    assert u["weighing, two indications"] == "0.00012 g"  # √2 · 0.00015 / √3
    assert u["errors of the balance"] == "0.00010 g"
    assert u["temperature of the water"] == "0.10 °C"
    assert u["humidity of the air"] == "2.0 %"
    budget = next(one for one in judged.checks if one.name == "budget")
    assert budget.verdict == "holds"


def test_thermometer_of_the_house_corrects_the_water():
    filled = with_instruments(PIPETTE, HOUSE)
    # 20.0 °C lies midway between 10 (0) and 30 (+0.4)
    assert float(filled["weighings"][0]["water"]) == pytest.approx(20.2)
    assert PIPETTE["weighings"][0]["water"] == "20.0"
    with pytest.raises(Unacceptable, match="reaches no further") as refused:
        with_instruments(PIPETTE | {"weighings": [{"net": "9.9", "water": "9.0"}]}, HOUSE)
    assert refused.value.field == "weighings[0].water"


def test_bound_that_was_typed_goes_before_that_of_the_house():
    typed = {"water_temperature": {"unit": "Cel", "u": "0.5"}}
    filled = with_instruments(PIPETTE | {"uncertainty": typed}, HOUSE)
    assert filled["uncertainty"]["water_temperature"] == typed["water_temperature"]
    odd = with_instruments(PIPETTE | {"uncertainty": "much"}, HOUSE)
    assert odd["uncertainty"] == "much"


def test_balance_states_its_smallest_mass_by_version():
    judged = judge_run("balance", BALANCE)
    readings = [float(one) for one in BALANCE["repeatability"]["readings"]]
    mean = sum(readings) / 5
    s = math.sqrt(sum((one - mean) ** 2 for one in readings) / 4)
    # USP <41>: 2000 · max(s, 0.41 d)
    assert float(judged.document["minimum_g"]) == pytest.approx(2000 * max(s, 0.000041), rel=1e-6)


def test_thermometer_serves_by_its_table_or_as_a_bound():
    by_table = judge_run("thermometer", THERMOMETER).document
    assert by_table["error_table"] == [["10.0", "-0.05"], ["30.0", "0.10"]]
    bound = judge_run("thermometer", THERMOMETER | {"serves": "bound"}).document
    assert "error_table" not in bound
    assert float(bound["reading"]["half_width"]) > 0.10
    with pytest.raises(Unacceptable) as refused:
        judge_run("thermometer", THERMOMETER | {"serves": "by eye"})
    assert refused.value.field == "serves"


@pytest.mark.parametrize(("mV", "verdict"), [("-166.2", "holds"), ("-157.0", "fails")])
def test_probe_is_judged_by_its_slope(mV, verdict):
    # Nernst at 25 °C: 59.16 mV; 2.85 units between JIS phthalate 4.01 and phosphate 6.86
    first, second = 166.2, 0.0
    slope = abs(float(mV)) / (59.16 * 2.85)
    run = PROBE | {
        "buffers": [
            {"buffer": "phthalate", "temperature": "25", "mV": str(-float(mV))},
            {"buffer": "phosphate", "temperature": "25", "mV": str(second)},
        ]
    }
    judged = judge_run("probe", run)
    assert float(judged.document["slope_percent"]) == pytest.approx(100 * slope, abs=0.05)
    assert judged.checks[0].verdict == verdict
    assert first > second


def test_preview_shows_volumes_as_they_come():
    rows = PIPETTE["weighings"]
    one = preview_run("pipette", PIPETTE | {"weighings": [rows[0], {"before": "1.0"}, rows[1]]})
    assert set(one.volumes) == {0, 2}
    assert one.unfinished == (1,)
    whole = judge_run("pipette", PIPETTE).told.volumes
    assert one.volumes[2] == whole[1]
    assert one.judged is not None
    alone = preview_run("pipette", PIPETTE | {"weighings": rows[:1]})
    assert set(alone.volumes) == {0}
    assert alone.judged is None
    assert "two weighings" in alone.says
    nothing = preview_run("pipette", PIPETTE | {"weighings": []})
    assert (nothing.volumes, nothing.judged) == ({}, None)


def test_preview_names_the_place_that_the_row_has_in_the_form():
    rows = [{"before": "1.0"}, {"before": "20", "after": "19", "water": "20.0"}]
    found = preview_run("pipette", PIPETTE | {"weighings": rows})
    assert found.field == "weighings[1].after"
    assert "weighings[1]" in found.says


def test_preview_of_another_kind_says_what_stands_against_it():
    found = preview_run("probe", PROBE | {"buffers": []})
    assert found.judged is None
    assert found.field == "buffers"
    assert preview_run("probe", PROBE).judged is not None


def test_drop_is_a_part_of_what_many_weigh():
    run = {
        "water": "degassed", "glass_expansion": "9.9e-6", "air": AIR,
        "weighings": [{"net": net, "water": "20.0"} for net in ("0.9971", "0.9981", "0.9961")],
    }  # fmt: skip
    drop = judge_drop(run, 20)
    assert float(drop.volume_text) == pytest.approx(0.9971 * 1.00284 / 20, rel=1e-4)
    assert drop.weighings == 3
    with pytest.raises(Unacceptable, match="not known"):
        judge_drop(run | {"kind": "pipette"}, 20)
