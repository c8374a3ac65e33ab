from datetime import UTC, datetime, timedelta

from hypothesis import given, settings
from hypothesis import strategies as st

from server.lab.watching import Doubt, History, Stated, changes, status_at

DAY = timedelta(days=1)
START = datetime(2026, 5, 4, 8, 30, tzinfo=UTC)


def stated(number, day, good_for=14, notice=3, reported="0.1000 mol/L"):
    issued = START + day * DAY
    return Stated(number, reported, issued, issued + good_for * DAY, notice)


def told(history, *, days=100):
    found = changes(history, since=START, until=START + days * DAY)
    return [((one.at - START) / DAY, one.after.state) for one in found]


def test_time_alone_makes_check_due_and_lapsed_each_told_once():
    history = History(certificates=(stated("TL-1", -1),))
    assert told(history) == [(10.0, "check due"), (13.0, "lapsed")]
    assert told(history, days=12) == [(10.0, "check due")]


def test_replaced_certificate_is_one_change_of_number_and_date():
    second = stated("TL-2", 5, reported="0.1001 mol/L")
    history = History(certificates=(stated("TL-1", -1), second))
    first, *later = changes(history, since=START, until=START + 100 * DAY)
    assert (first.before.certificate, first.after.certificate) == ("TL-1", "TL-2")
    assert first.before.state == first.after.state == "in force"
    assert first.after.reported == "0.1001 mol/L"
    assert first.after.good_until == second.valid_until
    assert [one.after.state for one in later] == ["check due", "lapsed"]  # of the second alone


def test_hold_and_release_are_two_changes_with_their_reasons():
    held, released = START + DAY, START + 2 * DAY
    history = History(
        certificates=(stated("TL-1", -1),),
        own_holds=(Doubt(held, released),),
        reasons=((held, "cloudy"), (released, "filtered, clear")),
    )
    first, second = changes(history, since=START, until=START + 3 * DAY)
    assert (first.after.state, first.why) == ("held", "cloudy")
    assert (second.after.state, second.why) == ("in force", "filtered, clear")


def test_two_holds_that_overlap_change_the_state_only_at_their_ends():
    history = History(
        certificates=(stated("TL-1", -1),),
        lot_holds=(Doubt(START + DAY, START + 3 * DAY),),
        own_holds=(Doubt(START + 2 * DAY, START + 4 * DAY),),
    )
    assert told(history, days=9) == [(1.0, "held"), (4.0, "in force")]


def test_nothing_is_told_after_a_pull_but_a_new_number():
    history = History(
        certificates=(stated("TL-1", -1), stated("TL-2", 5)),
        own_holds=(Doubt(START + 3 * DAY, None),),
        pulled_at=START + 2 * DAY,
    )
    assert told(history) == [(2.0, "pulled"), (5.0, "pulled")]


def test_opened_bottle_lapses_before_its_certificate_where_the_lot_says_so():
    history = History(
        certificates=(stated("TL-1", -1),), opened_at=START + DAY, opened_until=START + 6 * DAY
    )
    assert told(history) == [(1.0, "in force"), (3.0, "check due"), (6.0, "lapsed")]
    assert status_at(history, START).good_until == START + 13 * DAY
    assert status_at(history, START + DAY).good_until == START + 6 * DAY


def test_watch_from_later_tells_nothing_of_what_was_before():
    history = History(certificates=(stated("TL-1", -1),))
    assert changes(history, since=START + 13 * DAY, until=START + 99 * DAY) == ()


_HOURS = st.integers(-200, 900)


def _moment(hours):
    return START + timedelta(hours=hours)


@st.composite
def histories(draw):
    issued = sorted(draw(st.sets(_HOURS, max_size=4)))
    certificates = tuple(
        Stated(f"TL-{i}", f"{i}", _moment(at), _moment(at + draw(st.integers(1, 500))), 3)
        for i, at in enumerate(issued)
    )
    holds = [
        Doubt(_moment(at), _moment(at + long) if long else None)
        for at, long in draw(st.lists(st.tuples(_HOURS, st.integers(0, 200)), max_size=3))
    ]
    some = st.one_of(st.none(), _HOURS)
    used, pulled, opened = (draw(some) for _ in range(3))
    return History(
        certificates=certificates,
        lot_holds=tuple(holds[:1]),
        own_holds=tuple(holds[1:]),
        pulled_at=None if pulled is None else _moment(pulled),
        used_up_at=None if used is None else _moment(used),
        opened_at=None if opened is None else _moment(opened),
        opened_until=None if opened is None else _moment(opened + 300),
    )


@settings(max_examples=60, deadline=None)
@given(histories(), _HOURS, st.integers(0, 400), st.integers(0, 400))
def test_changes_agree_with_looking_every_hour_however_often_one_reads(history, since, one, two):
    """Against a second way: the status asked hour by hour, and the span read in two parts."""
    begin, middle, end = _moment(since), _moment(since + one), _moment(since + one + two)
    found = changes(history, since=begin, until=end)
    seen, before = [], status_at(history, begin)
    for hour in range(since + 1, since + one + two + 1):
        after = status_at(history, _moment(hour))
        if after != before:
            seen.append((_moment(hour), after))
            before = after
    assert [(change.at, change.after) for change in found] == seen
    first = changes(history, since=begin, until=middle)
    assert (*first, *changes(history, since=middle, until=end)) == found
