from datetime import timedelta

import pytest

from server.lab.in_use import judge, kind_of_slot, things_in_use
from server.lab.sheet_facts import HoldFact, OverrideFact

WORDS = {"basis": "own plan", "zone": "Europe/Berlin", "what": "calibration"}


@pytest.mark.parametrize(
    ("slot", "kinds"),
    [
        ("container_and_standard", ("standard lot", "balance")),
        ("mass", ("standard lot", "balance")),
        ("burette_end", ("burette", "probe")),
        ("blank", ("burette", "probe")),
        ("temperature", ("thermometer",)),
        ("air_humidity", ("room monitor",)),
        ("remark", ()),
        ("step:mixed", ()),
    ],
)
def test_slot_uses_its_instruments(slot, kinds):
    found = kind_of_slot(slot)
    assert set(kinds) <= set(found)
    assert bool(found) is bool(kinds)


def test_judge_due_instant_is_exclusive(sheet_parts):
    now = sheet_parts["now"]
    tick = timedelta(microseconds=1)
    assert judge("U-1", due_at=now, holds=(), used_at=now - tick, **WORDS)[0] == "in date"
    state, says = judge("U-1", due_at=now, holds=(), used_at=now, **WORDS)
    assert state == "lapsed"
    assert says == "The calibration of U-1 was good until 2026-05-04 (own plan); it has lapsed."


def test_judge_doubt_that_stands_counts_whenever_it_was_used(sheet_parts):
    now = sheet_parts["now"]
    doubt = HoldFact(now, None, "tip chipped")
    found = judge("U-1", due_at=now + timedelta(days=9), holds=(doubt,), used_at=now, **WORDS)
    assert found == ("held", "U-1 is held: tip chipped.")
    early = now - timedelta(hours=1)
    assert judge("U-1", due_at=now, holds=(doubt,), used_at=early, **WORDS)[0] == "held"


def test_judge_doubt_released_counts_only_while_it_stood(sheet_parts):
    now = sheet_parts["now"]
    due = now + timedelta(days=9)
    doubt = HoldFact(now, now + timedelta(hours=1), "tip chipped")
    states = [
        judge("U-1", due_at=due, holds=(doubt,), used_at=now + timedelta(minutes=m), **WORDS)[0]
        for m in (-1, 0, 59, 60)
    ]
    assert states == ["in date", "held", "held", "in date"]


def test_things_are_judged_at_their_last_use_not_today(facts, entry, sheet_parts):
    now = sheet_parts["now"]
    due = now + timedelta(minutes=30)
    burette = sheet_parts["instrument"]("burette", due_at=due)
    read = entry(1, "burette_end", "18.64", received_at=now + timedelta(minutes=29))
    sheet = facts(instruments=(burette,), standard_lot=None, entries=(read,))
    (thing,) = things_in_use(sheet)
    assert (thing.state, thing.used_at, thing.blocks) == ("in date", read.received_at, False)
    (today,) = things_in_use(sheet, at=now + timedelta(days=1))
    assert (today.state, today.blocks) == ("lapsed", True)


def test_thing_not_used_yet_is_judged_at_the_beginning(facts, sheet_parts):
    assert {one.used_at for one in things_in_use(facts())} == {sheet_parts["now"]}


def test_standard_lot_stands_first(facts):
    kinds = [one.kind for one in things_in_use(facts())]
    assert kinds == ["standard lot", "balance", "burette", "thermometer"]


def test_thing_let_be_used_does_not_block_and_names_the_last_word(facts, sheet_parts):
    now = sheet_parts["now"]
    burette = sheet_parts["instrument"]("burette", due_at=now - timedelta(days=1))
    words = tuple(
        OverrideFact("burette", reason, sheet_parts["keeper"], now) for reason in ("a", "b")
    )
    sheet = facts(instruments=(burette,), standard_lot=None, overrides=words)
    (thing,) = things_in_use(sheet)
    assert (thing.state, thing.blocks, thing.override.reason) == ("lapsed", False, "b")
