"""Checks between two calibrations, from the lines of a log in ink."""

from datetime import UTC, datetime, timedelta
from itertools import count

import pytest

from server.lab.calibration.check_log import (
    charts_of,
    judged_checks,
    last_checked,
    need_chart,
)
from server.lab.in_use import flag_of, off_limits
from server.lab.refusal import Unacceptable
from server.lab.sheet_facts import InstrumentFact, LogFact, PersonFact, StrikeFact

NOW = datetime(2026, 5, 4, 8, 0, tzinfo=UTC)
IDA = PersonFact("p", "Ida Mohnke", "IM")
LIMITS = {"name": "100 g", "centre": "100.0000", "warning": "0.0002", "action": "0.0003"}
BUFFER = {"set": "JIS Z 8802:2011", "buffer": "phosphate"}


@pytest.fixture
def line():
    numbers = count(1)

    def make(what, document, *, day=0, struck=None):
        at = NOW + timedelta(days=day)
        strike = (
            None if struck is None else StrikeFact(IDA, NOW + timedelta(days=struck), "misread")
        )
        return LogFact(f"l{next(numbers)}", what, document, IDA, at, strike)

    return make


def weighings(line, chart, *readings):
    return [
        line("check weighing", {"chart": chart.id, "reading": one}, day=day)
        for day, one in enumerate(readings, start=1)
    ]


@pytest.mark.parametrize(
    ("reading", "verdict"),
    # warning ± 0.2 mg, action ± 0.3 mg: the limit itself is within
    [("100.0002", "holds"), ("100.00021", "look"), ("100.0003", "look"), ("100.00031", "fails"),
     ("99.9998", "holds"), ("99.9996", "fails")],
)  # fmt: skip
def test_check_weighing_is_judged_at_its_limits(line, reading, verdict):
    chart = line("check weight", LIMITS)
    (found,) = judged_checks([chart, *weighings(line, chart, reading)], "balance")
    assert found.outcome.verdict == verdict


def test_second_of_three_beyond_warning_on_one_side_fails(line):
    chart = line("check weight", LIMITS)
    log = [chart, *weighings(line, chart, "100.00025", "100.0000", "100.00025", "99.99975")]
    verdicts = [one.outcome.verdict for one in judged_checks(log, "balance")]
    assert verdicts == ["look", "holds", "fails", "look"]
    assert last_checked(log, "balance", at=NOW + timedelta(days=9)).outcome.verdict == "look"
    assert last_checked(log, "balance", at=NOW + timedelta(days=3)).outcome.verdict == "fails"
    assert last_checked(log, "balance", at=NOW) is None


def test_check_keeps_the_limits_of_its_own_day(line):
    wide, narrow = line("check weight", LIMITS), None
    first = weighings(line, wide, "100.0002")
    narrow = line("check weight", LIMITS | {"warning": "0.0001", "action": "0.00015"}, day=2)
    later = line("check weighing", {"chart": narrow.id, "reading": "100.0002"}, day=3)
    log = [wide, *first, narrow, later]
    assert [one.outcome.verdict for one in judged_checks(log, "balance")] == ["holds", "fails"]
    (stands,) = charts_of(log, "balance")
    assert stands.line.id == narrow.id


def test_check_struck_through_counts_no_more_but_did_when_the_sheet_was_handed_in(line):
    chart = line("check weight", LIMITS)
    bad = line("check weighing", {"chart": chart.id, "reading": "100.0009"}, day=1, struck=5)
    log, later = [chart, bad], NOW + timedelta(days=6)
    assert last_checked(log, "balance", at=later) is None
    then = last_checked(log, "balance", at=later, as_of=NOW + timedelta(days=4))
    assert then.outcome.verdict == "fails"


@pytest.mark.parametrize(
    ("shown", "verdict"),
    # JIS Z 8802:2011, phosphate at 25 °C: pH 6.86; warning 0.03, action 0.05
    [("6.86", "holds"), ("6.89", "holds"), ("6.90", "look"), ("6.91", "look"), ("6.92", "fails"),
     ("6.80", "fails")],
)  # fmt: skip
def test_buffer_check_is_judged_by_the_table_at_its_temperature(line, shown, verdict):
    chart = line("check buffer", BUFFER)
    check = line("buffer check", {"chart": chart.id, "temperature": "25", "pH": shown}, day=1)
    (found,) = judged_checks([chart, check], "probe")
    assert found.outcome.verdict == verdict
    assert found.off == pytest.approx(float(shown) - 6.86, abs=1e-9)


@pytest.mark.parametrize(
    ("document", "field"),
    [
        ({"set": "made up", "buffer": "phosphate"}, "set"),
        ({"set": "JIS Z 8802:2011", "buffer": "cola"}, "buffer"),
        (BUFFER | {"warning": "0.1", "action": "0.05"}, "action"),
        (BUFFER | {"colour": "pink"}, "colour"),
    ],
)
def test_odd_limits_of_a_buffer_are_refused_by_field(line, document, field):
    with pytest.raises(Unacceptable) as refused:
        charts_of([line("check buffer", document)], "probe")
    assert refused.value.field == field


def test_chart_is_picked_where_there_are_several(line):
    first = line("check weight", LIMITS)
    with pytest.raises(Unacceptable, match="keeper"):
        need_chart([], "balance", "")
    assert need_chart([first], "balance", "").line is first
    second = line("check weight", LIMITS | {"name": "20 g"})
    with pytest.raises(Unacceptable, match="Pick one of 100 g, 20 g"):
        need_chart([first, second], "balance", "")
    assert need_chart([first, second], "balance", second.id).name == "20 g"


def test_flag_tells_a_failed_check_and_a_failing_calibration(line):
    chart = line("check weight", LIMITS)
    log = (chart, *weighings(line, chart, "100.0009"))
    fact = InstrumentFact(
        "balance", "i", "B-1", {}, "c", 1, "C-1", "house", "2026-01-01", NOW, "plan", {}, (),
        failing=("The slope is off.",), log=log,
    )  # fmt: skip
    assert flag_of(fact, at=NOW, zone="UTC") == "Its calibration: The slope is off."
    says = flag_of(fact, at=NOW + timedelta(days=2), zone="UTC")
    assert "Last check weighing" in says
    assert "do not weigh with this balance" in says


def test_check_of_one_weight_does_not_heal_that_of_another(line):
    heavy, light = (line("check weight", LIMITS | {"name": name}) for name in ("100 g", "20 g"))
    bad = line("check weighing", {"chart": light.id, "reading": "100.0009"}, day=1)
    good = line("check weighing", {"chart": heavy.id, "reading": "100.0000"}, day=2)
    counts = last_checked([heavy, light, bad, good], "balance", at=NOW + timedelta(days=3))
    assert counts.line is bad
    healed = line("check weighing", {"chart": light.id, "reading": "100.0000"}, day=3)
    counts = last_checked([heavy, light, bad, good, healed], "balance", at=NOW + timedelta(days=3))
    assert counts.outcome.verdict == "holds"
    assert counts.line is healed


@pytest.mark.parametrize(
    ("done_on", "entered", "stopped"),
    # the check fails on 5 May
    [("2026-05-05", 2, False), ("2026-05-06", 2, False), ("2026-05-04", 2, True),
     ("2026-05-05", 0, True)],
)  # fmt: skip
def test_failed_check_is_healed_by_a_calibration_done_and_entered_after_it(
    line, done_on, entered, stopped
):
    chart = line("check weight", LIMITS)
    fact = InstrumentFact(
        "balance", "i", "B-1", {}, "c", 2, "C-2", "house", done_on, NOW, "plan", {}, (),
        log=(chart, *weighings(line, chart, "100.0009")),
        recorded_at=NOW + timedelta(days=entered),
    )  # fmt: skip
    at = NOW + timedelta(days=3)
    assert bool(off_limits(fact, at=at, zone="UTC")) is stopped
    healed = "It was calibrated after that." in flag_of(fact, at=at, zone="UTC")
    assert healed is not stopped


@pytest.mark.parametrize(("reading", "stopped"), [("100.0003", False), ("100.00031", True)])
def test_balance_is_off_limits_beyond_action_and_not_at_it(line, reading, stopped):
    chart = line("check weight", LIMITS)
    fact = InstrumentFact(
        "balance", "i", "B-1", {}, "c", 1, "C-1", "house", "2026-01-01", NOW, "plan", {}, (),
        log=(chart, *weighings(line, chart, reading)),
    )  # fmt: skip
    says = off_limits(fact, at=NOW + timedelta(days=2), zone="UTC")
    if not stopped:
        assert says == ""
        return
    assert says.startswith("The last check weighing of B-1, 2026-05-05, failed. 100 g: 100.00031 g")
    assert "action ± 0.0003 g" in says
