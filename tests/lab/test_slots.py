from dataclasses import replace

import pytest

from server.lab.refusal import Unacceptable
from server.lab.rig import Rig, Span
from server.lab.slots import (
    all_rows,
    replicate_rows,
    replicates_shown,
    row_at,
    segments_begun,
    sheet_rows,
)

RIG = Rig(4, Span("0", "220"), None, 2, Span("0", "25"), None, 1)
TABLED = Rig(4, Span("0", "220"), Span("0", "200"), 2, Span("0", "25"), Span("0", "24"), 1)


def slots_of(rows):
    return [row.slot for row in rows]


def test_sheet_rows_stand_in_the_order_of_the_work(recipe):
    found = sheet_rows(recipe(buoyancy=True, blank="indicator"), RIG)
    assert slots_of(found) == [
        "step:mixed", "indicator", "temperature", "air_temperature", "air_pressure",
        "air_humidity", "blank", "remark",
    ]  # fmt: skip
    assert [row.slot for row in found if not row.required] == ["remark"]


def test_sheet_rows_own_indicator_is_the_first_choice(recipe):
    rows = sheet_rows(recipe(end_point={"mode": "visual", "indicator": "methyl red"}), RIG)
    choices = next(row.choices for row in rows if row.slot == "indicator")
    assert choices[0] == "methyl red"
    assert len(choices) == len(set(choices))


def test_sheet_rows_potentiometric_asks_for_no_indicator(recipe):
    assert "indicator" not in slots_of(
        sheet_rows(recipe(end_point={"mode": "potentiometric"}), RIG)
    )


def test_replicate_rows_by_difference(recipe):
    rows = replicate_rows(recipe(), RIG, 2)
    assert slots_of(rows) == [
        "container_and_standard", "container_less_standard", "burette_start", "burette_end",
        "excluded",
    ]  # fmt: skip
    assert {row.replicate for row in rows} == {2}
    assert [row.decimals for row in rows] == [4, 4, 2, 2, None]


def test_replicate_rows_tared_asks_for_the_load_only_beside_a_table(recipe):
    tared = recipe(weighing="tared", temperature="each")
    assert slots_of(replicate_rows(tared, RIG, 1))[:1] == ["mass"]
    rows = replicate_rows(tared, TABLED, 1)
    assert slots_of(rows)[:2] == ["tare_load", "mass"]
    assert "temperature" in slots_of(rows)
    assert next(row for row in rows if row.slot == "burette_end").high == "24"


def test_replicate_rows_repeat_the_burette_for_each_filling(recipe):
    rows = replicate_rows(recipe(), RIG, 1, segments=3)
    assert [row.segment for row in rows if row.slot == "burette_end"] == [1, 2, 3]


def test_replicate_rows_of_a_curve_take_the_place_of_the_burettes(recipe):
    by_probe = recipe(end_point={"mode": "potentiometric", "method": "model fit"})
    rows = replicate_rows(by_probe, RIG, 2)
    assert slots_of(rows) == [
        "container_and_standard", "container_less_standard", "curve", "end_point_method",
        "excluded",
    ]  # fmt: skip
    assert [(row.kind, row.required) for row in rows[2:4]] == [("curve", True), ("choice", False)]
    assert rows[3].choices[-1] == "model fit"


def test_temperature_span_is_that_of_water_unless_an_expansion_is_stated(recipe):
    stated = recipe(liquid_expansion={"value": "1.1e-3", "unit": "1/K"})
    highs = [
        next(row.high for row in sheet_rows(one, RIG) if row.slot == "temperature")
        for one in (recipe(), stated)
    ]
    assert highs == ["40", "100"]


def test_rows_shown_grow_by_one_for_each_replicate_left_out(recipe, entry):
    out = entry(2, "excluded", "spilled or lost", reason="flask fell over")
    assert replicates_shown(recipe(), []) == 3
    assert replicates_shown(recipe(), [out]) == 4
    assert replicates_shown(recipe(), [entry(6, "mass", "0.4084")]) == 6


def test_rows_shown_never_pass_twenty(recipe, entry):
    reason = {"reason": "flask fell over"}
    outs = [entry(n, "excluded", "spilled or lost", **reason) for n in range(1, 21)]
    assert replicates_shown(recipe(replicates=20), outs) == 20


def test_all_rows_hold_every_filling_that_was_begun(recipe, entry):
    entries = [entry(1, "burette_start", "0.00", segment=2)]
    assert segments_begun({one.place: one for one in entries}, 1) == 2
    ends = [
        row.segment
        for row in all_rows(recipe(), RIG, entries)
        if row.place[:2] == (1, "burette_end")
    ]
    assert ends == [1, 2]


@pytest.mark.parametrize(
    ("place", "field"),
    [
        ((21, "mass", 1), "replicate"),
        ((-1, "remark", 1), "replicate"),
        ((1, "burette_end", 10), "segment"),
        ((1, "burette_end", 0), "segment"),
        ((1, "colour", 1), "slot"),
        ((0, "burette_end", 1), "slot"),
        ((1, "temperature", 1), "slot"),
        ((1, "container_and_standard", 2), "slot"),
    ],
)
def test_row_at_place_that_the_recipe_does_not_ask_is_refused_by_field(recipe, place, field):
    with pytest.raises(Unacceptable) as refused:
        row_at(recipe(), RIG, place)
    assert refused.value.field == field


@pytest.mark.parametrize("place", [(0, "remark", 9), (3, "remark", 1), (20, "burette_end", 9)])
def test_row_at_place_within_bounds_is_found(recipe, place):
    assert row_at(recipe(), RIG, place).place == place


def test_temperature_ends_where_the_thermometers_table_ends(recipe):
    def ends(table):
        rig = replace(RIG, thermometer_table=table)
        row = row_at(recipe(), rig, (0, "temperature", 1))
        return row.low, row.high

    assert ends(None) == ("0", "40")
    assert ends(Span("10.0", "30.0")) == ("10.0", "30.0")
    assert ends(Span("-5", "60")) == ("0", "40")
