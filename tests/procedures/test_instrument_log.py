"""Checks between two calibrations: written by who weighs, in ink, and felt at the bench."""

import pytest

from server.lab.refusal import NotAllowed, NotFound, Unacceptable
from server.procedures.instrument_log import (
    MeasureDrop,
    SetLimits,
    StrikeLine,
    WriteCheck,
    measure_drop,
    set_limits,
    strike_check,
    write_check,
)
from server.procedures.instruments import (
    RecordCalibration,
    RegisterInstrument,
    record_calibration,
    register_instrument,
)
from server.records.queries.list_log import log_lines

LIMITS = {"name": "100 g", "centre": "100.0000", "warning": "0.0002", "action": "0.0003"}


def limits(lab, document=None, who="keeper", instrument=""):
    command = SetLimits(instrument or lab.balance, document or LIMITS)
    return lab.act(set_limits, command, who)


def check(lab, reading="100.0001", who="analyst", **given):
    lab.clock.move(seconds=1)  # lines of one instant have no order
    command = WriteCheck(given.pop("instrument", lab.balance), reading=reading, **given)
    return lab.act(write_check, command, who)


def lines(lab):
    return lab.transactions.read(
        lambda session: log_lines(session, "instrument", [lab.balance]).get(lab.balance, ())
    )


def findings(lab, sheet):
    found = lab.evaluate(sheet).result["findings"]
    return {one["name"]: one for one in found}


def write_one(lab, sheet):
    lab.write_lines(
        [(0, "step:mixed", "done"), (0, "indicator", "phenolphthalein"), (0, "temperature", "20.4"),
         (1, "container_and_standard", "60.4084"), (1, "container_less_standard", "60.0000"),
         (1, "burette_start", "0.00"), (1, "burette_end", "20.00")],
        sheet=sheet,
    )  # fmt: skip


def test_check_is_a_line_in_the_log_and_in_the_trail(lab):
    chart = limits(lab)
    made = check(lab, remark="after cleaning")
    log = lines(lab)
    assert [one.what for one in log] == ["check weight", "check weighing"]
    assert log[1].id == made
    assert log[1].document == {
        "chart": chart, "reading": "100.0001", "remark": "after cleaning",
    }  # fmt: skip
    assert log[1].by.printed_name == "Ida Mohnke"
    assert [act for _, act, _ in lab.acts()[-2:]] == [
        "set limits of a check", "wrote a check weighing",
    ]  # fmt: skip
    assert lab.chain().holds


def test_line_is_struck_with_a_reason_and_stays_readable(lab):
    limits(lab)
    made = check(lab, "109.0001")
    lab.act(strike_check, StrikeLine(lab.balance, made, "misread"), "second analyst")
    struck = lines(lab)[1]
    assert struck.document["reading"] == "109.0001"
    assert (struck.struck.by.printed_name, struck.struck.reason) == ("Pavel Orrin", "misread")
    with pytest.raises(NotAllowed):
        lab.act(strike_check, StrikeLine(lab.balance, made, "again"), "analyst")
    for line, reason, problem in ((made[:-1] + "x", "a", NotFound), (lines(lab)[0].id, "", None)):
        with pytest.raises(problem or Unacceptable):
            lab.act(strike_check, StrikeLine(lab.balance, line, reason), "keeper")


def test_limits_are_struck_by_a_keeper_only(sqlite_lab):
    lab = sqlite_lab
    chart = limits(lab)
    with pytest.raises(NotAllowed):
        lab.act(strike_check, StrikeLine(lab.balance, chart, "wrong weight"), "analyst")
    assert lines(lab)[0].struck is None
    lab.act(strike_check, StrikeLine(lab.balance, chart, "wrong weight"), "keeper")
    assert lines(lab)[0].struck is not None


@pytest.mark.parametrize(
    ("who", "may_set", "may_check"),
    [("analyst", False, True), ("keeper", True, True), ("countersigner", False, False),
     ("steward", False, False), ("reader", False, False)],
)  # fmt: skip
def test_limits_are_set_by_a_keeper_and_checks_written_by_who_works(
    sqlite_lab, who, may_set, may_check
):
    lab = sqlite_lab
    limits(lab)
    for may, act in ((may_set, limits), (may_check, check)):
        if may:
            act(lab, who=who)
        else:
            with pytest.raises(NotAllowed):
                act(lab, who=who)


@pytest.mark.parametrize(
    ("document", "field"),
    [
        ({"name": ""}, "name"),
        ({"name": "x", "centre": "100"}, "warning"),
        ({"name": "x", "first": ["1", "2"], "step": "0.1"}, "first"),
        ({"name": "x", "first": ["1", "2", "3", "4", "5"]}, "step"),
        (LIMITS | {"action": "0.0001"}, "action"),
        (LIMITS | {"colour": "red"}, "colour"),
    ],
)
def test_odd_limits_are_refused_by_field(shared_lab, document, field):
    with pytest.raises(Unacceptable) as refused:
        limits(shared_lab, document)
    assert refused.value.field == field


def test_odd_check_is_refused_by_field(sqlite_lab):
    lab = sqlite_lab
    with pytest.raises(Unacceptable, match="keeper sets") as refused:
        check(lab)
    assert refused.value.field == "chart"
    limits(lab)
    for given, field in (
        ({"reading": ""}, "reading"), ({"reading": "1,0"}, "reading"),
        ({"reading": "100.0", "chart": "x"}, "chart"),
        ({"reading": "100.0", "remark": "x" * 501}, "remark"),
    ):  # fmt: skip
        with pytest.raises(Unacceptable) as refused:
            check(lab, **given)
        assert refused.value.field == field
    with pytest.raises(Unacceptable, match="no check of its own"):
        check(lab, instrument=lab.burette)
    with pytest.raises(NotFound):
        check(lab, instrument="none")


def test_check_beyond_the_action_limit_fails_the_sheet_that_weighs_after_it(sqlite_lab):
    lab = sqlite_lab
    sheet = lab.begin()
    limits(lab)
    check(lab, "100.0009")
    lab.clock.move(minutes=5)
    write_one(lab, sheet)
    found = findings(lab, sheet)["check weighing"]
    assert found["verdict"] == "fails"
    assert "beyond the action limit" in found["says"]
    thing = next(one for one in lab.facts(sheet).instruments if one.kind == "balance")
    assert thing.log
    lab.clock.move(minutes=5)
    check(lab, "100.0001")
    # the weighings were made before the second check: it does not heal them
    assert findings(lab, sheet)["check weighing"]["verdict"] == "fails"


def refused_for(lab, who="analyst", **other):
    with pytest.raises(Unacceptable) as refused:
        lab.begin(who, **other)
    assert refused.value.field == "balance_id"
    return refused.value.says


def test_balance_beyond_its_action_limit_begins_no_sheet_until_a_good_check(lab):
    limits(lab)
    check(lab, "100.0009")
    lab.clock.move(minutes=1)
    says = refused_for(lab)
    assert "The last check weighing of Balance B-1, 2026-05-04, failed. 100 g: 100.0009 g" in says
    assert "action ± 0.0003" in says
    # waiting heals nothing, and a reason is a keeper's to give
    lab.clock.move(days=40)
    assert "2026-05-04, failed" in refused_for(lab)
    assert "2026-05-04, failed" in refused_for(lab, override_reason="looks fine to me")
    check(lab, "100.0001")
    lab.clock.move(minutes=1)
    assert lab.facts(lab.begin()).overrides == ()


def test_balance_that_failed_its_check_is_freed_by_a_new_calibration(sqlite_lab):
    lab = sqlite_lab
    limits(lab)
    check(lab, "100.0009")
    lab.clock.move(minutes=1)
    # done in January, entered today: it says nothing about the balance of today
    linearity = {"unit": "g", "half_width": "0.0002", "shape": "rectangular"}
    lab.calibrate(lab.balance, {"linearity": linearity}, "2027-05-31")
    assert "failed" in refused_for(lab)
    command = RecordCalibration(
        lab.balance, "C-18", "calibration house", "2026-05-04", "2027-05-03", "own plan",
        {"linearity": linearity},
    )  # fmt: skip
    lab.act(record_calibration, command, "keeper")
    sheet = lab.begin()
    lab.clock.move(minutes=1)
    write_one(lab, sheet)
    found = findings(lab, sheet)["check weighing"]
    assert found["verdict"] == "look"
    assert "It was calibrated after that." in found["says"]


def test_keepers_word_lets_a_balance_that_failed_its_check_be_used(sqlite_lab):
    lab = sqlite_lab
    limits(lab)
    check(lab, "100.0009")
    lab.clock.move(minutes=1)
    sheet = lab.begin("keeper", override_reason="the check weight was dropped")
    (word,) = lab.facts(sheet).overrides
    assert (word.what, word.reason) == ("balance", "the check weight was dropped")
    write_one(lab, sheet)
    # the word lets it be used; that the check failed stays told
    assert findings(lab, sheet)["check weighing"]["verdict"] == "fails"


def test_sheet_without_a_check_on_its_day_is_looked_at_where_checks_are_kept(sqlite_lab):
    lab = sqlite_lab
    sheet = lab.begin()
    write_one(lab, sheet)
    assert "check weighing" not in findings(lab, sheet)
    limits(lab)
    none = findings(lab, sheet)["check weighing"]
    assert (none["verdict"], "there was none before" in none["says"]) == ("look", True)
    check(lab)
    lab.clock.move(days=1)
    other = lab.begin()
    write_one(lab, other)
    late = findings(lab, other)["check weighing"]
    assert late["verdict"] == "look"
    assert "the last was on 2026-05-04" in late["says"]
    check(lab)
    lab.clock.move(minutes=1)
    third = lab.begin()
    write_one(lab, third)
    assert findings(lab, third)["check weighing"]["verdict"] == "holds"


def test_probe_is_checked_in_a_buffer(sqlite_lab):
    lab = sqlite_lab
    command = RegisterInstrument("probe", "Probe E-1", "Holm", "glass", "1", "Bench 1")
    probe = lab.act(register_instrument, command, "keeper")
    limits(lab, {"set": "JIS Z 8802:2011", "buffer": "phosphate"}, instrument=probe)
    check(lab, "", instrument=probe, pH="6.88", temperature="25.0")
    with pytest.raises(Unacceptable) as refused:
        check(lab, "", instrument=probe, pH="6.88")
    assert refused.value.field == "temperature"


DROP = {
    "water": "degassed", "glass_expansion": "9.9e-6",
    "air": {"temperature": "21.3", "pressure": "1003.1", "humidity": "46"},
    "weighings": [{"net": one, "water": "20.0"} for one in ("0.9971", "0.9981", "0.9961")],
}  # fmt: skip


def test_drop_of_a_burette_is_measured_and_logged(lab):
    lab.act(measure_drop, MeasureDrop(lab.burette, 20, DROP), "analyst")
    (line,) = lab.transactions.read(
        lambda session: log_lines(session, "instrument", [lab.burette])[lab.burette]
    )
    assert line.what == "drop volume"
    assert float(line.document["volume"]["value"]) == pytest.approx(0.05, rel=1e-3)
    for command in (MeasureDrop(lab.balance, 20, DROP), MeasureDrop(lab.burette, 0, DROP)):
        with pytest.raises(Unacceptable):
            lab.act(measure_drop, command, "analyst")
