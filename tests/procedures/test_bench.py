from concurrent.futures import ThreadPoolExecutor
from uuid import uuid4

import pytest

from server.lab.refusal import NotAllowed, NotFound, Unacceptable
from server.procedures.bench import AbandonSheet, LetBeUsed, abandon_sheet, let_be_used
from server.procedures.entries import NewEntry
from server.procedures.holds import HoldThing, hold_thing
from server.procedures.instruments import RegisterInstrument, register_instrument
from server.procedures.lots import (
    ConfirmPull,
    MakeUpLot,
    ProposePull,
    confirm_pull,
    make_up_lot,
    propose_pull,
)
from server.procedures.stores import (
    ReceiveStandardLot,
    WriteRecipe,
    receive_standard_lot,
    write_recipe,
)

LAPSED_ON = "2026-05-03"
STATED = {"reading": {"unit": "Cel", "U": "0.2", "k": "2"}}
DELIVERY = {
    "capacity": {"value": "25", "unit": "mL"},
    "delivery": {"unit": "mL", "half_width": "0.02", "shape": "triangular"},
}


def refusal(lab, who="analyst", kind=Unacceptable, **other):
    with pytest.raises(kind) as refused:
        lab.begin(who, **other)
    return refused.value


def remark(text="x"):
    return NewEntry(str(uuid4()), 0, "remark", text)


def reading(slot, text, replicate=1):
    return NewEntry(str(uuid4()), replicate, slot, text)


def test_sheet_begun_keeps_what_it_rests_on_and_is_noted(lab):
    facts = lab.facts()
    assert facts.number == "S-2026-0001"
    assert (facts.state, facts.revision) == ("open", 1)
    assert facts.standard_lot.name == "KHP lot 7"
    assert [one.name for one in facts.instruments] == [
        "Balance B-1",
        "Burette U-1",
        "Thermometer T-1",
    ]
    assert lab.acts()[-1] == ("Ida Mohnke", "began a bench sheet", "sheet")


def test_sheet_may_be_begun_by_a_bottles_code(sqlite_lab):
    sheet = sqlite_lab.begin(lot_code=sqlite_lab.bottle.lower())
    assert sqlite_lab.facts(sheet).lot.code == sqlite_lab.lot


def test_sheets_begun_at_once_get_numbers_without_gaps(lab):
    with ThreadPoolExecutor(8) as pool:
        sheets = list(pool.map(lambda _: lab.begin(), range(8)))
    numbers = sorted(lab.facts(one).number for one in sheets)
    assert numbers == [f"S-2026-{n:04d}" for n in range(2, 10)]
    assert lab.chain().holds


def test_sheet_keeps_the_calibration_with_which_it_began(sqlite_lab):
    before = sqlite_lab.facts().instrument("burette")
    sqlite_lab.calibrate(sqlite_lab.burette, DELIVERY, "2027-05-31")
    assert sqlite_lab.facts().instrument("burette") == before
    assert sqlite_lab.facts(sqlite_lab.begin()).instrument("burette").version == 2


@pytest.mark.parametrize(
    ("other", "field"),
    [
        ({"balance_id": ""}, "balance_id"),
        ({"burette_id": str(uuid4())}, "burette_id"),
        ({"thermometer_id": None}, "thermometer_id"),
    ],
)
def test_sheet_without_an_instrument_is_refused_by_field(shared_lab, other, field):
    assert refusal(shared_lab, **other).field == field


def test_sheet_with_an_instrument_of_another_kind_is_refused(shared_lab):
    assert refusal(shared_lab, balance_id=shared_lab.burette).says == "There is no such balance."


@pytest.mark.parametrize(
    ("other", "field"),
    [
        ({"lot_code": "ABCDEFGH"}, "code"),
        ({"recipe_id": "x"}, "recipe_id"),
        ({"standard_lot_id": "x"}, "standard_lot_id"),
    ],
)
def test_sheet_on_something_unknown_is_not_found(shared_lab, other, field):
    assert refusal(shared_lab, kind=NotFound, **other).field == field


def test_sheet_with_an_instrument_never_calibrated_is_refused(sqlite_lab):
    command = RegisterInstrument("thermometer", "New", "Holm", "x", "1", "Bench")
    new = sqlite_lab.act(register_instrument, command, "keeper")
    refused = refusal(sqlite_lab, thermometer_id=new)
    assert (refused.field, "no calibration yet" in refused.says) == ("thermometer_id", True)


def test_sheet_with_another_titrant_or_strength_is_refused(sqlite_lab):
    for titrant, nominal in (("KOH", "0.1"), ("NaOH", "0.5")):
        lot = sqlite_lab.act(make_up_lot, MakeUpLot(titrant, nominal), "analyst")
        refused = refusal(sqlite_lab, lot_code=lot)
        assert refused.field == "recipe_id"
        assert f"this lot is {titrant} {nominal} mol/L" in refused.says


def test_sheet_nominal_spelled_with_more_zeros_fits(sqlite_lab):
    lot = sqlite_lab.act(make_up_lot, MakeUpLot("NaOH", "0.100"), "analyst")
    assert sqlite_lab.facts(sqlite_lab.begin(lot_code=lot)).lot.nominal == "0.100"


def test_sheet_with_an_older_version_of_a_recipe_is_refused(sqlite_lab):
    document = {
        "title": "New", "titrant": {"substance": "NaOH", "nominal": "0.1"}, "standard": "KHP",
        "end_point": {"mode": "potentiometric"},
    }  # fmt: skip
    sqlite_lab.act(write_recipe, WriteRecipe("NaOH against KHP", document, 1), "keeper")
    assert "has a newer version" in refusal(sqlite_lab).says
    assert sqlite_lab.facts().recipe.version == 1


def test_sheet_with_another_standard_than_the_recipes_is_refused(sqlite_lab):
    command = ReceiveStandardLot(
        "Tris lot",
        "TRIS",
        "RM-8",
        "house",
        "2028-01-31",
        "expiry",
        {"value": "0.9998", "u": "0.0002"},
    )
    other = sqlite_lab.act(receive_standard_lot, command, "keeper")
    assert refusal(sqlite_lab, standard_lot_id=other).field == "standard_lot_id"


def test_sheet_on_a_pulled_lot_is_refused_and_an_open_one_closed_to_the_pen(sqlite_lab):
    sqlite_lab.act(propose_pull, ProposePull(sqlite_lab.lot, "wrong salt"), "keeper")
    sqlite_lab.act(confirm_pull, ConfirmPull(sqlite_lab.lot), "countersigner")
    assert "out of use for good" in refusal(sqlite_lab, kind=NotAllowed).says
    with pytest.raises(NotAllowed, match="out of use for good"):
        sqlite_lab.write(remark())


def test_sheet_on_a_lot_past_its_use_by_day_is_refused(sqlite_lab):
    command = MakeUpLot("NaOH", "0.1", use_by="2026-05-04")
    lot = sqlite_lab.act(make_up_lot, command, "analyst")
    sqlite_lab.begin(lot_code=lot)
    sqlite_lab.clock.move(hours=14)
    refused = refusal(sqlite_lab, kind=NotAllowed, lot_code=lot)
    assert (refused.field, "2026-05-04" in refused.says) == ("lot_code", True)


def test_sheet_that_could_not_be_evaluated_for_want_of_a_density_is_refused(sqlite_lab):
    document = {
        "title": "Odd", "titrant": {"substance": "NaOH", "nominal": "0.1"},
        "standard": "NH4HSO4", "ratio": "1", "end_point": {"mode": "potentiometric"},
    }  # fmt: skip
    recipe = sqlite_lab.act(write_recipe, WriteRecipe("Odd", document), "keeper")
    plain = {
        "substance": "NH4HSO4", "certificate_number": "RM-9", "issuer": "house",
        "due_on": "2028-01-31", "due_basis": "expiry",
        "mass_fraction": {"value": "0.999", "u": "0.0005"},
    }  # fmt: skip
    without = ReceiveStandardLot("Odd 1", **plain)
    lot = sqlite_lab.act(receive_standard_lot, without, "keeper")
    refused = refusal(sqlite_lab, recipe_id=recipe, standard_lot_id=lot)
    assert (refused.field, "density" in refused.says) == ("standard_lot_id", True)
    stated = ReceiveStandardLot("Odd 2", **plain, density={"value": "1.78", "unit": "g/cm3"})
    lot = sqlite_lab.act(receive_standard_lot, stated, "keeper")
    # the next thing that is asked for is the room monitor
    assert refusal(sqlite_lab, recipe_id=recipe, standard_lot_id=lot).field == "room_id"


# R005: out of date


def test_sheet_with_a_lapsed_burette_is_refused_and_told_why(lab):
    lapsed = lab.register(
        "burette",
        "Old burette",
        {"identity": {"resolution": "0.01"}, "document": DELIVERY},
        LAPSED_ON,
    )
    refused = refusal(lab, burette_id=lapsed)
    assert refused.field == "burette_id"
    assert "Old burette was good until 2026-05-03 (own plan); it has lapsed" in refused.says
    assert "A keeper may let it be used" in refused.says


def test_calibration_is_good_through_its_last_local_day_and_not_after(sqlite_lab):
    # the laboratory's day ends at 22:00 UTC in summer
    today = sqlite_lab.register(
        "thermometer", "T-2", {"identity": {}, "document": STATED}, "2026-05-04"
    )
    sqlite_lab.clock.at = sqlite_lab.clock.at.replace(hour=21, minute=59, second=59)
    sqlite_lab.begin(thermometer_id=today)
    sqlite_lab.clock.move(seconds=1)
    assert refusal(sqlite_lab, thermometer_id=today).field == "thermometer_id"


def test_sheet_with_a_held_instrument_is_refused(sqlite_lab):
    sqlite_lab.act(hold_thing, HoldThing("instrument", sqlite_lab.balance, "drifts"), "analyst")
    refused = refusal(sqlite_lab)
    assert refused.says.startswith("Balance B-1 is held: drifts.")


def test_sheet_with_a_lapsed_or_held_standard_lot_is_refused(sqlite_lab):
    sqlite_lab.act(hold_thing, HoldThing("standard lot", sqlite_lab.standard_lot, "damp"), "keeper")
    assert refusal(sqlite_lab).field == "standard_lot_id"
    sqlite_lab.clock.at = sqlite_lab.clock.at.replace(year=2028, month=2)
    assert refusal(sqlite_lab).field == "standard_lot_id"


@pytest.mark.parametrize("who", ["analyst", "second analyst"])
def test_analyst_cannot_let_something_be_used_by_giving_a_reason(sqlite_lab, who):
    lapsed = sqlite_lab.register(
        "thermometer", "T-2", {"identity": {}, "document": STATED}, LAPSED_ON
    )
    refused = refusal(sqlite_lab, who, thermometer_id=lapsed, override_reason="it is fine")
    assert refused.field == "thermometer_id"


def test_keeper_lets_a_lapsed_instrument_be_used_with_a_reason(lab):
    lapsed = lab.register("thermometer", "T-2", {"identity": {}, "document": STATED}, LAPSED_ON)
    sheet = lab.begin("keeper", thermometer_id=lapsed, override_reason="checked in ice today")
    (words,) = lab.facts(sheet).overrides
    assert (words.what, words.reason, words.by.printed_name) == (
        "thermometer", "checked in ice today", "Nils Obermark",
    )  # fmt: skip
    assert words.at == lab.clock()


def test_keeper_without_anything_out_of_date_does_not_begin_a_sheet(sqlite_lab):
    refused = refusal(sqlite_lab, "keeper", kind=NotAllowed, override_reason="just so")
    assert "you need the role analyst" in refused.says
    assert refusal(sqlite_lab, "keeper", kind=NotAllowed)


def test_reading_with_an_instrument_that_lapsed_meanwhile_is_refused(lab):
    soon = lab.register("thermometer", "T-2", {"identity": {}, "document": STATED}, "2026-05-04")
    lab.sheet = lab.begin(thermometer_id=soon)
    lab.clock.move(hours=14)
    with pytest.raises(Unacceptable) as refused:
        lab.write(reading("temperature", "20.4", replicate=0))
    assert refused.value.field == "Temperature of the titrant"
    lab.write(reading("burette_start", "0.00"), remark())
    lab.act(let_be_used, LetBeUsed(lab.sheet, "thermometer", "checked in ice"), "keeper")
    lab.write(reading("temperature", "20.4", replicate=0))
    assert lab.acts()[-2] == ("Nils Obermark", "let something out of date be used", "sheet")


def test_reading_while_the_burette_is_held_is_refused_until_released_or_let(sqlite_lab):
    sqlite_lab.act(
        hold_thing, HoldThing("instrument", sqlite_lab.burette, "tip chipped"), "analyst"
    )
    with pytest.raises(Unacceptable, match="Burette U-1 is held: tip chipped"):
        sqlite_lab.write(reading("burette_start", "0.00"))
    sqlite_lab.write(reading("container_and_standard", "60.5450"))


@pytest.mark.parametrize(
    ("what", "reason", "field"), [("stove", "x", "what"), ("burette", "  ", "reason")]
)
def test_letting_be_used_without_thing_or_reason_is_refused(shared_lab, what, reason, field):
    with pytest.raises(Unacceptable) as refused:
        shared_lab.act(let_be_used, LetBeUsed(shared_lab.sheet, what, reason), "keeper")
    assert refused.value.field == field


# abandoning


def test_sheet_abandoned_stays_readable_and_takes_no_more_ink(lab):
    lab.write(remark("first"))
    lab.act(abandon_sheet, AbandonSheet(lab.sheet, "burette leaked"), "analyst")
    facts = lab.facts()
    assert (facts.state, len(facts.entries)) == ("abandoned", 1)
    for again in (
        lambda: lab.write(remark()),
        lambda: lab.act(abandon_sheet, AbandonSheet(lab.sheet, "again"), "analyst"),
        lambda: lab.act(let_be_used, LetBeUsed(lab.sheet, "burette", "x"), "keeper"),
    ):
        with pytest.raises(NotAllowed, match="abandoned"):
            again()


def test_abandoning_without_reason_is_refused(shared_lab):
    with pytest.raises(Unacceptable) as refused:
        shared_lab.act(abandon_sheet, AbandonSheet(shared_lab.sheet, " "), "analyst")
    assert refused.value.field == "reason"
