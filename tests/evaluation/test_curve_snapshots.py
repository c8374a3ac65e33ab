"""Snapshots of curve records: they replay bit for bit, whatever a later fit would find."""

import json
from pathlib import Path

import pytest

from server.evaluation import curve_readings
from server.evaluation.entrance import evaluate
from server.evaluation.snapshot import make_snapshot, replay
from server.lab.canonical import canonical

KHP = "khp-manual-burette"
RECORDS = Path(__file__).parents[1] / "reference" / "records"


def snapshot(record, **more):
    return make_snapshot(record, None, evaluate(record, **more), **more)


@pytest.mark.parametrize("method", ["model fit", "first derivative", None])
def test_snapshot_of_a_curve_record_replays_bit_for_bit(curve_records, method):
    made = snapshot(curve_records.record(KHP, method=method), trials=10_000)
    again = replay(made.text, expected_digest=made.digest)
    assert again.agrees, again.says
    assert canonical(again.result) == canonical(json.loads(made.text)["result"])


def test_replay_does_not_ask_a_later_fit(curve_records, monkeypatch):
    record = curve_records.record(KHP, method="model fit")
    made = snapshot(record)

    def later(*_):
        raise AssertionError("the curve was read again")

    monkeypatch.setattr(curve_readings, "analysed", later)
    curve_readings.analysed_curve.cache_clear()
    again = replay(made.text, expected_digest=made.digest)
    assert again.agrees, again.says
    assert canonical(again.result) == canonical(json.loads(made.text)["result"])


def test_replay_with_another_end_point_does_not_agree(curve_records):
    made = snapshot(curve_records.record(KHP, method="model fit"))
    held = json.loads(made.text)
    held["curves"][0]["volume_mL"] += 0.002
    assert not replay(json.dumps(held)).agrees


def test_snapshot_holds_points_volumes_and_u(curve_records):
    record = curve_records.record(KHP, method="model fit")
    held = json.loads(snapshot(record).text)
    assert held["record"]["replicates"][0]["curve"] == record["replicates"][0]["curve"]
    for kept, row in zip(held["curves"], held["result"]["methods"], strict=True):
        for key in ("taken", "proposed", "stated", "volume_mL", "u_shared_mL", "u_own_mL"):
            assert kept[key] == row[key]


def test_snapshot_without_curves_holds_none(curve_records):
    record = curve_records.record(KHP)
    for one in record["replicates"]:
        del one["curve"]
        one["delivered"] = "21.79"
    del record["end_point"]
    record["repeatability"] = {"relative_u": "0.0005"}
    held = json.loads(snapshot(record).text)
    assert "curves" not in held
    assert "methods" not in held["result"]


EXACT = json.loads((RECORDS.parent / "values_before_curves.json").read_text("utf-8"))["records"]


@pytest.mark.parametrize("name", sorted(EXACT))
def test_record_without_curves_gives_the_bits_it_gave_before_there_were_any(name):
    record = json.loads((RECORDS / f"{name}.json").read_text("utf-8"))
    found = evaluate(record)["concentration"]
    # another machine's exp may differ in its last bit; the relative distance of bits is 2e-16
    assert found["value"] == pytest.approx(float.fromhex(EXACT[name]["c"]), rel=4e-16, abs=0)
    assert found["u"] == pytest.approx(float.fromhex(EXACT[name]["u"]), rel=1e-14, abs=0)
