from datetime import UTC, datetime, timedelta

import pytest

from server.lab.states import (
    BOTTLE_STATES,
    bottle_state,
    certificate_state,
    due_state,
    lot_state,
    may_be_used,
    sheet_state,
)

NOW = datetime(2026, 5, 4, 8, 30, tzinfo=UTC)
TICK = timedelta(microseconds=1)


@pytest.mark.parametrize(
    ("set_instants", "state"),
    [
        ((), "open"),
        (("handed_in_at",), "handed in"),
        (("handed_in_at", "sent_back_at"), "sent back"),
        (("handed_in_at", "countersigned_at"), "countersigned"),
        (("abandoned_at",), "abandoned"),
        (("handed_in_at", "sent_back_at", "abandoned_at"), "abandoned"),
    ],
)
def test_sheet_state_follows_from_the_instants(set_instants, state):
    names = ("handed_in_at", "sent_back_at", "countersigned_at", "abandoned_at")
    assert sheet_state(**{name: NOW if name in set_instants else None for name in names}) == state


def state_of_lot(**changed):
    usual = {"valid_until": NOW, "notice_days": 3, "held": False, "pulled": False, "now": NOW}
    return lot_state(**usual | changed)


@pytest.mark.parametrize(
    ("now", "state"),
    [
        (NOW - timedelta(days=3) - TICK, "in force"),
        (NOW - timedelta(days=3), "check due"),
        (NOW - TICK, "check due"),
        (NOW, "lapsed"),
        (NOW + timedelta(days=400), "lapsed"),
    ],
)
def test_lot_state_changes_at_the_very_instant(now, state):
    assert state_of_lot(now=now) == state


def test_lot_state_without_certificate_is_unproven():
    assert state_of_lot(valid_until=None) == "unproven"


def test_lot_state_doubt_goes_before_time_and_pull_before_doubt():
    assert state_of_lot(held=True) == "held"
    assert state_of_lot(held=True, pulled=True) == "pulled"
    assert state_of_lot(valid_until=None, held=True) == "held"


def test_lot_state_without_notice_is_in_force_until_the_end():
    assert state_of_lot(notice_days=0, now=NOW - TICK) == "in force"


@pytest.mark.parametrize(
    ("lot", "held", "used_up", "state"),
    [
        ("in force", False, False, "in force"),
        ("check due", False, False, "check due"),
        ("in force", True, False, "held"),
        ("lapsed", True, False, "held"),
        ("pulled", True, False, "pulled"),
        ("pulled", True, True, "used up"),
        ("unproven", False, True, "used up"),
    ],
)
def test_bottle_state_is_the_graver_of_lot_and_bottle(lot, held, used_up, state):
    assert bottle_state(lot, held=held, used_up=used_up) == state


def test_only_two_states_may_be_used():
    assert [one for one in BOTTLE_STATES if may_be_used(one)] == ["in force", "check due"]


def test_certificate_state_replaced_goes_before_pulled():
    assert certificate_state(replaced=False, pulled=False) == "standing"
    assert certificate_state(replaced=False, pulled=True) == "pulled"
    assert certificate_state(replaced=True, pulled=True) == "replaced"


@pytest.mark.parametrize(
    ("due_at", "held", "state"),
    [
        (NOW + timedelta(days=30) + TICK, False, "in date"),
        (NOW + timedelta(days=30), False, "due soon"),
        (NOW + TICK, False, "due soon"),
        (NOW, False, "lapsed"),
        (NOW + timedelta(days=90), True, "held"),
    ],
)
def test_due_state_changes_at_the_very_instant(due_at, held, state):
    assert due_state(due_at=due_at, held=held, now=NOW) == state
