"""A standard lot's end, its drying and what is left of it."""

from datetime import UTC, date, datetime, time, timedelta
from zoneinfo import ZoneInfo

import pytest

from server.lab.calibration.drying_log import judge_drying, read_demand, read_drying
from server.lab.calibration.standard_lot import after_period, expiry_of, remaining_mass
from server.lab.refusal import Unacceptable

ZONE = "Europe/Berlin"


@pytest.mark.parametrize(
    ("given", "day", "rule"),
    [
        ({}, date(2028, 3, 31), "expiry of the certificate"),
        ({"opened_on": date(2026, 2, 1), "period_after_opening": "12 months"}, date(2027, 2, 1),
         "period after opening, 12 months from 2026-02-01"),
        ({"opened_on": date(2027, 9, 1), "period_after_opening": "12 months"}, date(2028, 3, 31),
         "expiry of the certificate"),
        ({"period_after_opening": "1 month"}, date(2028, 3, 31), "expiry of the certificate"),
        ({"retest_on": date(2026, 12, 24)}, date(2026, 12, 24), "re-test day"),
    ],
)  # fmt: skip
def test_earliest_rule_sets_the_end(given, day, rule):
    found = expiry_of(certificate_expiry=date(2028, 3, 31), zone=ZONE, **given)
    assert found.day == day
    assert found.until.rule == rule
    # the exclusive instant at the end of the laboratory's local day
    midnight = datetime.combine(day + timedelta(days=1), time(), ZoneInfo(ZONE))
    assert found.until.at == midnight
    assert found.until.at.tzinfo is UTC


def test_lot_without_any_rule_is_refused():
    with pytest.raises(Unacceptable, match="until when"):
        expiry_of(certificate_expiry=None, zone=ZONE, period_after_opening="2 years")


@pytest.mark.parametrize(
    ("day", "period", "end"),
    [
        (date(2026, 1, 31), "1 month", date(2026, 2, 28)),
        (date(2027, 12, 31), "2 months", date(2028, 2, 29)),
        (date(2026, 8, 31), "12 months", date(2027, 8, 31)),
        (date(2026, 8, 31), "2 years", date(2028, 8, 31)),
        (date(2026, 12, 31), "90 days", date(2027, 3, 31)),
    ],
)
def test_period_ends_on_its_calendar_day(day, period, end):
    assert after_period(day, period) == end


@pytest.mark.parametrize("period", ["a while", "0 days", "-1 month", "1.5 years", "700 months"])
def test_period_that_is_none_is_refused(period):
    with pytest.raises(Unacceptable) as caught:
        after_period(date(2026, 1, 1), period)
    assert caught.value.field == "period_after_opening"


def test_use_log_leaves_what_was_not_taken():
    left = remaining_mass("25.0", ["0.4123", "0.4056", "0.3999"], minimum_sample_g="0.2")
    assert str(left.left_g) == "23.7822"
    assert left.check.verdict == "holds"


@pytest.mark.parametrize(
    ("taken", "verdict"),
    [(["0.8"], "holds"), (["0.9"], "look"), (["1.0"], "look"), (["1.1"], "fails")],
)
def test_use_log_speaks_up_near_its_end(taken, verdict):
    assert remaining_mass("1.0", taken, minimum_sample_g="0.2").check.verdict == verdict


def test_use_log_refuses_what_is_no_mass():
    with pytest.raises(Unacceptable) as caught:
        remaining_mass("25", ["0.4", "-0.4"])
    assert caught.value.field == "taken[1]"


AT = datetime(2026, 5, 4, 8, tzinfo=UTC)
# EURAMET and supplier certificates differ; 120 °C, 2 h for KHP is common practice (from memory)
KHP = {"low_C": "110", "high_C": "120", "hours": "2", "desiccator": True}


def dried(temperature, hours, *, desiccator=True, before=timedelta(hours=3)):
    entry = {"temperature": temperature, "hours": hours, "desiccator": desiccator}
    return read_drying(entry, AT - before)


@pytest.mark.parametrize(
    ("entry", "verdict", "says"),
    [
        (dried("115", "2"), "holds", "as its certificate asks"),
        (dried("110", "2.0"), "holds", "as its certificate asks"),
        (dried("120", "3"), "holds", "as its certificate asks"),
        (dried("109.9", "2"), "fails", "less than 110"),
        (dried("121", "2"), "fails", "more than 120"),
        (dried("115", "1.9"), "fails", "1.9 h are less than 2 h"),
        (dried("115", "2", desiccator=False), "look", "no desiccator"),
        (dried("115", "2", before=timedelta(hours=-1)), "fails", "No drying is recorded"),
        (read_drying({"desiccator": True}, AT), "fails", "not in an oven"),
    ],
)
def test_drying_is_judged_by_the_demand(entry, verdict, says):
    check = judge_drying(read_demand(KHP), [entry], used_at=AT)
    assert check.verdict == verdict
    assert says in check.says


def test_last_drying_before_the_use_counts():
    log = [dried("115", "2"), dried("90", "2", before=timedelta(hours=1))]
    assert judge_drying(read_demand(KHP), log, used_at=AT).verdict == "fails"
    assert judge_drying(read_demand(KHP), [], used_at=AT).verdict == "fails"


def test_drying_goes_stale_where_the_demand_says_so():
    demand = read_demand(KHP | {"good_for_hours": "24"})
    assert judge_drying(demand, [dried("115", "2")], used_at=AT).verdict == "holds"
    old = dried("115", "2", before=timedelta(hours=25))
    check = judge_drying(demand, [old], used_at=AT)
    assert check.verdict == "fails"
    assert "stood 25 h" in check.says


def test_standard_that_must_not_be_heated_fails_in_an_oven():
    demand = read_demand({"oven": False})
    assert judge_drying(demand, [], used_at=AT).verdict == "holds"
    assert judge_drying(demand, [dried("60", "1")], used_at=AT).verdict == "fails"


@pytest.mark.parametrize(
    ("document", "field"),
    [
        ({"low_C": "110"}, "drying_demand.high_C"),
        ({"low_C": "120", "high_C": "110"}, "drying_demand.high_C"),
        ({"hours": "3", "hours_most": "2"}, "drying_demand.hours_most"),
        ({"hours": 2}, "drying_demand.hours"),
        ({"oven": "no"}, "drying_demand.oven"),
        ({"colour": "white"}, "drying_demand.colour"),
    ],
)
def test_demand_that_cannot_be_is_refused(document, field):
    with pytest.raises(Unacceptable) as caught:
        read_demand(document)
    assert caught.value.field == field


def test_oven_without_time_is_refused():
    with pytest.raises(Unacceptable, match="hours is missing"):
        read_drying({"temperature": "110"}, AT)
