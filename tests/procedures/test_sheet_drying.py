"""The drying of a standard on a sheet: from its lot's log, from the sheet's row, or neither."""

import pytest

from server.evaluation.from_sheet import prepare_sheet
from server.procedures.standard_lots import (
    RecordDrying,
    StrikeLotLine,
    record_drying,
    strike_lot_line,
)
from server.procedures.stores import (
    ReceiveStandardLot,
    WriteRecipe,
    receive_standard_lot,
    write_recipe,
)
from server.records.tables.stores import Recipe
from server.sheets.bench_sheet import open_bench_sheet

SLOTS = ("container_and_standard", "container_less_standard", "burette_start", "burette_end")
SHEET = ((0, "step:mixed", "done"), (0, "indicator", "phenolphthalein"), (0, "temperature", "20.4"))
GOOD = (
    ("60.4084", "60.0000", "0.00", "20.00"),
    ("60.4102", "60.0000", "0.00", "20.08"),
    ("60.4066", "60.0000", "0.00", "19.91"),
)
DEMAND = {"low_C": "110", "high_C": "120", "hours": "2", "desiccator": True}


@pytest.fixture
def dried_lab(sqlite_lab):
    """A laboratory with a lot of KHP on the dried basis, which asks for 2 h at 110 to 120 °C."""
    lab = sqlite_lab
    received = ReceiveStandardLot(
        "KHP lot 9", "KHP", "RM-9", "reference house", "2028-01-31", "expiry",
        {"value": "0.9999", "U": "0.0004", "k": "2"}, basis="dried",
        drying="2 h at 115 °C, then in a desiccator", drying_demand=DEMAND,
    )  # fmt: skip
    lab.standard_lot = lab.act(receive_standard_lot, received, "keeper")
    return lab


def lines():
    found = list(SHEET)
    for number, readings in enumerate(GOOD, start=1):
        found += [(number, slot, text) for slot, text in zip(SLOTS, readings, strict=True)]
    return found


def with_step(lab, key):
    """Write the laboratory's recipe anew with a step of drying."""
    document = lab.transactions.read(lambda session: session.get_one(Recipe, lab.recipe).document)
    steps = [*document["steps"], {"key": key, "label": "KHP dried", "when": "before"}]
    command = WriteRecipe("NaOH against dried KHP", {**document, "steps": steps})
    return lab.act(write_recipe, command, "keeper")


def dry(lab, temperature="115", hours="2", **more):
    ended = lab.clock().isoformat()
    command = RecordDrying(lab.standard_lot, ended, temperature, hours, desiccator=True, **more)
    return lab.act(record_drying, command, "analyst")


def finding(lab, sheet):
    found = lab.evaluate(sheet).result["findings"]
    return next(one for one in found if one["name"] == "drying")


def written(lab, **begin):
    sheet = lab.begin(**begin)
    lab.clock.move(minutes=10)
    lab.write_lines(lines(), sheet=sheet)
    return sheet


def test_drying_in_the_log_before_use_holds(dried_lab):
    dry(dried_lab)
    found = finding(dried_lab, written(dried_lab))
    assert found["verdict"] == "holds"
    assert "Dried as its certificate asks." in found["says"]
    # the clock stands at 8:30 UTC, 10:30 in Berlin
    assert found["figure_text"] == "115 °C, 2 h, desiccator, ended 2026-05-04 10:30"


def test_no_drying_anywhere_fails(dried_lab):
    found = finding(dried_lab, written(dried_lab))
    assert found["verdict"] == "fails"
    assert "No drying is recorded before this use." in found["says"]


def test_drying_too_cold_fails_with_its_figure(dried_lab):
    dry(dried_lab, temperature="95")
    found = finding(dried_lab, written(dried_lab))
    assert found["verdict"] == "fails"
    assert "95 °C is less than 110 °C" in found["says"]


def test_drying_that_ended_after_the_first_weighing_does_not_hold(dried_lab):
    sheet = written(dried_lab)
    dried_lab.clock.move(minutes=30)
    dry(dried_lab)
    assert finding(dried_lab, sheet)["verdict"] == "fails"


def test_drying_struck_through_no_longer_holds(dried_lab):
    line = dry(dried_lab)
    sheet = written(dried_lab)
    strike = StrikeLotLine(dried_lab.standard_lot, line, "that was the other lot")
    dried_lab.act(strike_lot_line, strike, "second analyst")
    assert finding(dried_lab, sheet)["verdict"] == "fails"


def test_drying_struck_through_after_the_hand_in_leaves_the_sheet_as_it_was_signed(dried_lab):
    line = dry(dried_lab)
    sheet = written(dried_lab)
    dried_lab.hand_in(sheet, reasons={})
    signed = dried_lab.facts(sheet).evaluation
    dried_lab.clock.move(minutes=1)
    strike = StrikeLotLine(dried_lab.standard_lot, line, "that was the other lot")
    dried_lab.act(strike_lot_line, strike, "second analyst")
    assert prepare_sheet(dried_lab.facts(sheet)).input_digest == signed.input_digest
    dried_lab.countersign(sheet)
    assert prepare_sheet(dried_lab.facts(sheet)).input_digest == signed.input_digest


def test_sheets_row_is_enough_where_the_log_is_empty(dried_lab):
    recipe_id = with_step(dried_lab, "dried")
    sheet = dried_lab.begin(recipe_id=recipe_id)
    dried_lab.write_lines([(0, "step:dried", "2 h at 115 °C"), *lines()], sheet=sheet)
    found = finding(dried_lab, sheet)
    assert (found["verdict"], found["figure_text"]) == ("holds", "2 h at 115 °C")


def test_sheets_row_against_a_log_that_is_short_wants_a_look(dried_lab):
    recipe_id = with_step(dried_lab, "dried")
    dry(dried_lab, hours="1.5")
    sheet = dried_lab.begin(recipe_id=recipe_id)
    dried_lab.write_lines([(0, "step:dried", "done"), *lines()], sheet=sheet)
    found = finding(dried_lab, sheet)
    assert found["verdict"] == "look"
    assert "1.5 h are less than 2 h" in found["says"]
    assert "The sheet says: done." in found["says"]


def test_row_of_drying_offers_what_the_log_says(dried_lab):
    recipe_id = with_step(dried_lab, "khp-dried-how-long")
    dry(dried_lab)
    sheet = dried_lab.begin(recipe_id=recipe_id)

    def row():
        page = dried_lab.transactions.read(
            lambda session: open_bench_sheet(
                session, sheet, actor=dried_lab.people["analyst"], now=dried_lab.clock()
            )
        )
        return next(one for one in page.groups[0].rows if one.slot == "step:khp-dried-how-long")

    (offered,) = row().choices
    assert offered == "115 °C, 2 h, desiccator, ended 2026-05-04 10:30"
    dried_lab.write_lines([(0, "step:khp-dried-how-long", offered), *SHEET], sheet=sheet)
    assert row().choices == ()
    assert row().value.text == offered


def test_standard_that_must_not_be_heated_fails_after_an_oven(sqlite_lab):
    lab = sqlite_lab
    received = ReceiveStandardLot(
        "KHP lot 10", "KHP", "RM-10", "reference house", "2028-01-31", "expiry",
        {"value": "0.9999", "U": "0.0004", "k": "2"}, drying_demand={"oven": False},
    )  # fmt: skip
    lab.standard_lot = lab.act(receive_standard_lot, received, "keeper")
    assert finding(lab, written(lab))["verdict"] == "holds"
    dry(lab, temperature="60", hours="1")
    assert finding(lab, written(lab))["verdict"] == "fails"
