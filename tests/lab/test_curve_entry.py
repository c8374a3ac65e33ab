import json
from dataclasses import replace

import pytest

from server.lab.curve_entry import (
    MOST_POINTS,
    CurveDrop,
    CurveEntry,
    CurveFile,
    CurveRow,
    check_count,
    read_curve_entry,
    write_curve_entry,
)
from server.lab.refusal import Unacceptable

CURVE = CurveEntry(
    kind="pH",
    volume_mL=("0.00", "0.50", "1.00", "1.50", "2.00", "2.50"),
    reading=("4.01", "4.10", "4.20", "4.32", "4.50", "4.71"),
    seconds=("0", "10", "20", "30", "40", "50"),
    mapping={"volume": 0, "reading": 1, "time": 2, "kind": "pH"},
    set_aside=(CurveRow(7, "Row 7, column 1: the volume 0.20 is out of order and was left out."),),
    drop=CurveDrop("0.0487", "0.0002", "Burette U-1"),
    file=CurveFile("run3.csv", "ab" * 32),
)


def document(**changed):
    read = json.loads(write_curve_entry(CURVE)) | changed
    return json.dumps({key: value for key, value in read.items() if value != "drop it"})


def test_curve_entry_comes_back_as_it_was_written_digit_by_digit():
    raw = write_curve_entry(CURVE)
    assert read_curve_entry(raw) == CURVE
    assert '"0.50"' in raw
    assert write_curve_entry(read_curve_entry(raw)) == raw


def test_curve_entry_without_times_drops_and_file_comes_back_too():
    bare = replace(CURVE, seconds=None, set_aside=(), drop=None, file=None)
    assert read_curve_entry(write_curve_entry(bare)) == bare


def test_curve_entry_says_itself_in_short_words_and_as_a_record_has_it():
    assert CURVE.words == "run3.csv, 6 points, pH, with times, 1 left out"
    assert replace(CURVE, seconds=None, set_aside=(), file=None).words == "6 points, pH"
    record = CURVE.to_record()
    assert set(record) == {"volume_mL", "pH", "seconds"}
    assert record["pH"] == list(CURVE.reading)


@pytest.mark.parametrize(
    ("changed", "field"),
    [
        ({"format": "curve-entry/2"}, "curve.format"),
        ({"kind": "redox"}, "curve.kind"),
        ({"volume_mL": "0.00"}, "curve.volume_mL"),
        ({"volume_mL": ["0.00"] * 5}, "file"),
        ({"volume_mL": [0.5] * 6}, "curve.volume_mL[0]"),
        ({"volume_mL": ["x"] * 6}, "curve.volume_mL[0]"),
        ({"reading": ["4.01"] * 7}, "curve.reading"),
        ({"seconds": ["1"] * 7}, "curve.seconds"),
        ({"mapping": [0, 1]}, "curve.mapping"),
        ({"set_aside": {}}, "curve.set_aside"),
        ({"set_aside": [{"row": 0, "says": "x"}]}, "curve.set_aside[0].row"),
        ({"drop": {"volume_mL": "0"}}, "curve.drop.volume_mL"),
        ({"drop": {"volume_mL": 0.05}}, "curve.drop.volume_mL"),
        ({"file": {"name": "", "sha256": "ab"}}, "curve.file.name"),
        ({"colour": "pink"}, "curve.colour"),
    ],
)
def test_curve_entry_that_is_none_names_the_key(changed, field):
    with pytest.raises(Unacceptable) as refused:
        read_curve_entry(document(**changed))
    assert refused.value.field == field


@pytest.mark.parametrize("raw", [None, "", "{", "[]", "N  0.3888 g"])
def test_text_that_holds_no_curve_is_refused(raw):
    with pytest.raises(Unacceptable):
        read_curve_entry(raw)


@pytest.mark.parametrize(("points", "good"), [(5, False), (6, True), (MOST_POINTS, True)])
def test_curve_has_enough_points_and_not_too_many(points, good):
    if good:
        check_count(points)
        with pytest.raises(Unacceptable, match=f"at most {MOST_POINTS}"):
            check_count(MOST_POINTS + 1)
        return
    with pytest.raises(Unacceptable, match="at least 6"):
        check_count(points)
