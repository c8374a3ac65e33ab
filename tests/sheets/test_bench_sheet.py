"""The bench sheet as the script gets it: rows, strikes, the next row, the margin."""

import json
from dataclasses import asdict
from uuid import uuid4

import pytest
import sqlalchemy as sa

from server.lab.refusal import NotFound, NotSignedIn
from server.procedures.entries import NewEntry, WriteEntries, write_entries
from server.records.tables.bench import Sheet
from server.sheets.bench_sheet import open_bench_sheet


def row_of(sheet, replicate, slot, segment=1):
    return next(
        row
        for group in sheet.groups
        for row in group.rows
        if (row.replicate, row.slot, row.segment) == (replicate, slot, segment)
    )


def write(demo, sheet_id, *lines):
    entries = tuple(NewEntry(id=str(uuid4()), **line) for line in lines)
    command = WriteEntries(sheet_id, entries)
    actor = demo.people["bashir"]
    demo.write(lambda s: write_entries(s, command, actor=actor, now=demo.now))
    return [entry.id for entry in entries]


def test_sheet_shows_a_struck_value_beside_the_one_that_stands(demo) -> None:
    sheet = demo.read(open_bench_sheet, demo.summary.open_sheet_id, who="bashir")
    row = row_of(sheet, 2, "burette_end")
    (struck,) = row.struck
    assert float(struck.entry.text) - float(row.value.text) == pytest.approx(1)
    assert (struck.struck_by, struck.reason) == ("BO", "misread by a whole millilitre")
    assert row.value.reason == "misread by a whole millilitre"


def test_sheet_names_the_next_row_and_what_is_missing(demo) -> None:
    sheet = demo.read(open_bench_sheet, demo.summary.open_sheet_id, who="bashir")
    assert (sheet.next.replicate, sheet.next.slot, sheet.next.segment) == (3, "burette_start", 1)
    assert sheet.missing[0] == "Replicate 3: the burette start is not written yet."
    assert sheet.may_write
    assert not sheet.may_hand_in


def test_sheet_margin_has_mean_and_spread_of_what_is_whole(demo) -> None:
    margin = demo.read(open_bench_sheet, demo.summary.open_sheet_id, who="bashir").margin
    first, second, third = margin.replicates
    # the demo's bench is made of 0.09986 mol/L with 0.04 % scatter, and burette and blank errors
    assert float(first.value) == pytest.approx(0.09986, rel=2e-3)
    # both ends are rounded to five decimals
    assert float(margin.mean) == pytest.approx(
        (float(first.value) + float(second.value)) / 2, abs=1.01e-5
    )
    assert (third.value, third.says) == (None, "Burette, start to come")
    assert margin.to_go == 2
    assert margin.says == "2 more replicates to go."


def test_sheet_margin_tells_the_first_finding_that_does_not_hold(demo) -> None:
    sheet = demo.read(open_bench_sheet, demo.summary.sent_back_sheet_id, who="imke")
    assert (sheet.margin.finding.name, sheet.margin.finding.verdict) == ("spread", "fails")
    assert sheet.sent_back_remark.startswith("Replicate 3")
    assert sheet.may_hand_in
    assert sheet.signatures[0].holds


def test_sheet_for_a_reader_lights_no_row(demo) -> None:
    sheet = demo.read(open_bench_sheet, demo.summary.open_sheet_id, who="ottilie")
    assert (sheet.next, sheet.may_write, sheet.may_hand_in) == (None, False, False)


def test_sheet_is_json_with_one_key_a_field(demo) -> None:
    sheet = demo.read(open_bench_sheet, demo.summary.open_sheet_id, who="bashir")
    read = json.loads(json.dumps(asdict(sheet)))
    assert read["groups"][1]["rows"][0]["label"] == "Load before taring"
    assert {"groups", "next", "margin", "missing", "may_write", "correction_reasons"} <= set(read)


def test_sheet_rests_on_things_in_date_with_their_papers(demo) -> None:
    sheet = demo.read(open_bench_sheet, demo.summary.open_sheet_id, who="bashir")
    kinds = [one.kind for one in sheet.rests_on]
    assert kinds == ["recipe", "standard lot", "balance", "burette", "thermometer", "room monitor"]
    assert {one.state for one in sheet.rests_on[1:]} == {"in date"}
    assert "TM-0870/2" in sheet.rests_on[1].says


def test_sheet_left_out_replicate_stays_with_criterion_and_reason(demo) -> None:
    by_number = sa.select(Sheet.id).where(Sheet.number == "S-2026-0003")
    sheet_id = demo.transactions.read(lambda s: s.scalar(by_number))
    sheet = demo.read(open_bench_sheet, sheet_id, who="imke")
    group = next(one for one in sheet.groups if one.replicate == 4)
    assert group.excluded == ("titrated past the end point: yellow before the last drop was seen")
    assert [one.excluded for one in sheet.margin.replicates] == [False] * 3 + [True, False]


def test_sheet_second_filling_that_was_struck_stays_visible_and_asks_nothing(own_demo) -> None:
    sheet_id = own_demo.summary.open_sheet_id
    place = {"replicate": 2, "slot": "burette_start", "segment": 2}
    (first,) = write(own_demo, sheet_id, {**place, "text": "0.00"})
    asking = row_of(own_demo.read(open_bench_sheet, sheet_id, who="bashir"), **place)
    assert asking.required
    write(own_demo, sheet_id, {**place, "text": "", "strikes": first, "reason": "not refilled"})
    row = row_of(own_demo.read(open_bench_sheet, sheet_id, who="bashir"), **place)
    assert (row.value, row.required) == (None, False)
    assert row.struck[0].entry.text == "0.00"


def test_sheet_remark_on_a_replicate_has_a_row_of_its_own(own_demo) -> None:
    sheet_id = own_demo.summary.open_sheet_id
    write(own_demo, sheet_id, {"replicate": 2, "slot": "remark", "text": "<b>drop</b> at the tip"})
    sheet = own_demo.read(open_bench_sheet, sheet_id, who="bashir")
    assert row_of(sheet, 2, "remark").value.text == "<b>drop</b> at the tip"


def test_sheet_unknown_is_not_found_and_a_visitor_is_sent_to_sign_in(demo) -> None:
    with pytest.raises(NotFound):
        demo.read(open_bench_sheet, str(uuid4()), who="bashir")
    with pytest.raises(NotSignedIn):
        demo.read(open_bench_sheet, demo.summary.open_sheet_id, who=None)
