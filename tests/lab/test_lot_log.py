"""What follows from the log of a standard lot: its end, its drying, what is left."""

from dataclasses import replace
from datetime import UTC, date, datetime, timedelta
from decimal import Decimal

import pytest

from server.lab.log_lines import standing_lines
from server.lab.lot_log import (
    COUNT,
    DRYING,
    OPENED,
    RETEST,
    USE,
    drying_of,
    expiry_of_lot,
    is_drying_step,
    judge_lot_drying,
    last_drying,
    logged_words,
    opened_on,
)
from server.lab.lot_uses import (
    Taken,
    remaining_of,
    running_uses,
    taken_by_hand,
    weighed_masses,
)
from server.lab.sheet_facts import LogFact, PersonFact, StandardLotFact, StrikeFact
from server.lab.validity import end_of_day

ZONE = "Europe/Berlin"
AT = datetime(2026, 5, 4, 8, 0, tzinfo=UTC)
IDA = PersonFact("p", "Ida Mohnke", "IM")
STATED = (end_of_day(date(2028, 1, 31), ZONE), "expiry on the certificate")
DEMAND = {"low_C": "110", "high_C": "120", "hours": "2", "desiccator": True}


def line(what, at=AT, **document):
    return LogFact(f"{what} {at:%d %H:%M}", what, document, IDA, at)


def struck(one, at):
    return replace(one, struck=StrikeFact(IDA, at, "slip of the pen"))


def dried(before_h=1.0, temperature="115", hours="2", **more):
    ended = AT - timedelta(hours=before_h)
    return line(
        DRYING, ended, temperature=temperature, hours=hours, desiccator=True,
        ended_at=ended.isoformat(), **more,
    )  # fmt: skip


def lot(*log, **document):
    return StandardLotFact(
        "l", "KHP lot 7", "KHP", "RM-7", "house", STATED[0], STATED[1], document, (), log
    )


def end(document, *log, as_of=None):
    return expiry_of_lot(document, STATED, log, zone=ZONE, as_of=as_of)


def test_lot_without_other_rules_ends_with_its_certificate():
    found = end({}, line(OPENED, day="2026-05-04"))
    assert (found.at, found.basis) == STATED
    assert found.candidates == (("expiry on the certificate", date(2028, 1, 31)),)


def test_lot_with_a_period_ends_by_its_opening_once_it_is_opened():
    document = {"period_after_opening": "12 months"}
    assert end(document).basis == STATED[1]
    found = end(document, line(OPENED, day="2026-05-04"))
    assert found.at == end_of_day(date(2027, 5, 4), ZONE)
    assert found.basis == "period after opening, 12 months from 2026-05-04"
    assert [day for _, day in found.candidates] == [date(2028, 1, 31), date(2027, 5, 4)]


def test_lot_opening_struck_through_no_longer_ends_it():
    opened = struck(line(OPENED, day="2026-05-04"), AT + timedelta(hours=2))
    document = {"period_after_opening": "12 months"}
    assert end(document, opened).basis == STATED[1]
    # for a sheet that was handed in before the strike the line stands
    assert "opening" in end(document, opened, as_of=AT + timedelta(hours=1)).basis
    assert opened_on((opened,)) is None


def test_lot_retest_done_last_sets_the_next_day():
    document = {"retest_on": "2026-12-31"}
    assert end(document).at == end_of_day(date(2026, 12, 31), ZONE)
    first = line(RETEST, AT, done_on="2026-05-04", next_on="2027-05-04")
    second = line(RETEST, AT + timedelta(days=1), done_on="2026-05-05", next_on="2027-11-05")
    assert end(document, second, first).at == end_of_day(date(2027, 11, 5), ZONE)
    # a re-test does not carry a lot past its certificate
    late = line(RETEST, AT, done_on="2026-05-06", next_on="2029-01-01")
    assert end(document, late).basis == STATED[1]


def test_drying_before_the_first_weighing_holds_and_after_it_fails():
    one = lot(dried(), drying_demand=DEMAND)
    assert judge_lot_drying(one, used_at=(AT, AT + timedelta(hours=2))).verdict == "holds"
    assert judge_lot_drying(one, used_at=(AT - timedelta(hours=3), AT)).verdict == "fails"


def test_drying_of_a_lot_that_asks_nothing_in_figures_is_not_judged():
    assert judge_lot_drying(lot(dried()), used_at=(AT,)) is None


def test_drying_written_after_the_hand_in_does_not_count_for_the_sheet():
    late = replace(dried(), at=AT + timedelta(hours=5))
    one = lot(late, drying_demand=DEMAND)
    assert judge_lot_drying(one, used_at=(AT,)).verdict == "holds"
    at = AT + timedelta(hours=4)
    assert judge_lot_drying(one, used_at=(AT,), as_of=at).verdict == "fails"


def test_drying_that_ended_last_is_offered():
    log = (dried(5, hours="2.5"), dried(1), struck(dried(0.5), AT))
    assert last_drying(log, before=AT).id == dried(1).id
    assert logged_words(dried(1), ZONE) == "115 °C, 2 h, desiccator, ended 2026-05-04 09:00"
    assert drying_of(dried(1)).temperature_C == Decimal(115)
    assert last_drying((), before=AT) is None


@pytest.mark.parametrize(
    ("slot", "is_one"),
    [
        ("step:dried", True),
        ("step:khp-dried-how-long", True),
        ("step:drying", True),
        ("step:mixed", False),
        ("remark", False),
    ],
)
def test_drying_step_is_known_by_its_word(slot, is_one):
    assert is_drying_step(slot) is is_one


def test_standing_lines_are_those_of_the_kind_that_nobody_struck():
    log = (line(OPENED, day="x"), dried(), struck(dried(2), AT))
    assert [one.what for one in standing_lines(log, DRYING)] == [DRYING]


def test_masses_of_a_sheet_are_whole_weighings_only():
    readings = [
        (1, "container_and_standard", "60.5450"), (1, "container_less_standard", "60.1562"),
        (2, "container_and_standard", "60,5000"), (2, "container_less_standard", "60,1000"),
        (3, "container_and_standard", "60.5450"),
        (4, "tare_load", "25.1"), (4, "mass", "0.2411"),
        (5, "container_and_standard", "60.1"), (5, "container_less_standard", "60.5"),
    ]  # fmt: skip
    # QUAM:2012, A2: 60.5450 g − 60.1562 g = 0.3888 g
    assert weighed_masses(readings) == (Decimal("0.3888"), Decimal("0.4000"), Decimal("0.2411"))


def taken(mass, hours, **more):
    return Taken(AT + timedelta(hours=hours), Decimal(mass), "use", "Ida", **more)


def test_uses_run_down_from_what_came_in_the_order_of_time():
    document = {"received_g": "2.0", "minimum_sample_g": "0.2"}
    uses = running_uses(document, [taken("0.7", 2), taken("0.3888", 1)])
    assert [one.left_g for one in uses] == [Decimal("1.6112"), Decimal("0.9112")]
    found = remaining_of(document, uses)
    assert (found.left_g, found.check.verdict) == (Decimal("0.9112"), "holds")


def test_uses_beyond_what_came_are_told_and_never_hidden():
    document = {"received_g": "1.0"}
    uses = running_uses(document, [taken("0.7", 1), taken("0.7", 2)])
    assert uses[-1].left_g == Decimal("-0.4")
    found = remaining_of(document, uses)
    assert (found.check.verdict, found.left_g) == ("fails", Decimal("-0.4"))


def test_count_begins_anew():
    count = taken("0.95", 2, counted=True, line_id="c")
    uses = running_uses({}, [taken("0.5", 1), count, taken("0.25", 3)])
    assert [one.left_g for one in uses] == [None, Decimal("0.95"), Decimal("0.70")]
    assert remaining_of({}, uses).left_g == Decimal("0.70")
    nothing = running_uses({"received_g": "5"}, [taken("0", 1, counted=True, line_id="c")])
    assert remaining_of({"received_g": "5"}, nothing).left_g == 0


def test_remaining_of_a_lot_that_nobody_counted_is_not_told():
    assert remaining_of({}, running_uses({}, [taken("0.5", 1)])) is None


def test_lines_by_hand_are_uses_unless_they_are_struck():
    log = (
        line(USE, mass_g="0.50", says="loss on drying"),
        line(COUNT, AT + timedelta(hours=1), mass_g="9.1"),
        struck(line(USE, AT + timedelta(hours=2), mass_g="3", says="x"), AT),
    )
    found = taken_by_hand(log)
    assert [(one.mass_g, one.counted) for one in found] == [
        (Decimal("0.50"), False),
        (Decimal("9.1"), True),
    ]
