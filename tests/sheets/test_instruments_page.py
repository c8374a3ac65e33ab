"""Instruments by state, and one with its calibrations."""

import pytest
import sqlalchemy as sa

from server.demo import runs
from server.lab.refusal import NotFound, NotSignedIn
from server.procedures.instruments import (
    RecordCalibration,
    RegisterInstrument,
    record_calibration,
    register_instrument,
)
from server.records.tables.stores import Instrument
from server.sheets.instruments_page import open_calibration, open_instrument, open_instruments


def id_of(demo, name):
    asked = sa.select(Instrument.id).where(Instrument.name == name)
    return demo.transactions.read(lambda s: s.scalar(asked))


def test_instruments_stand_by_state_with_their_due_day(demo) -> None:
    page = demo.read(open_instruments, who="bashir")
    assert [(line.name, line.state) for line in page.instruments] == [
        ("Probe E-3", "due soon"),
        ("Room monitor R-1", "due soon"),
        ("Balance B-2", "in date"),
        ("Piston burette P-25", "in date"),
        ("Flask F-1000", "in date"),
        ("Pipette V-10", "in date"),
        ("Thermometer T-7", "in date"),
        ("Piston burette P-20", "lapsed"),
    ]
    lapsed = page.instruments[-1]
    assert (lapsed.due, lapsed.due_in, lapsed.due_basis) == (
        "25 Nov 2026", "6 days ago", "6 months, own plan",
    )  # fmt: skip
    assert not page.may_keep


def fields_of(page):
    return {one.label: (one.value, one.state) for one in page.identity}


def test_instrument_shows_the_twelve_fields_of_its_record(demo) -> None:
    # ISO/IEC 17025, 6.4.13: each is stated, not applicable with a reason, or named as missing
    page = demo.read(open_instrument, id_of(demo, "Pipette V-10"), who="bashir")
    fields = fields_of(page)
    assert len(fields) >= 12
    assert fields["Software or firmware"] == ("not applicable: glass", "not applicable")
    assert fields["Found fit before use"] == ("not stated yet", "missing")
    assert fields["Serial number"] == ("GH-10-552", "stated")
    assert fields["Result"][0].startswith("holds: TB-G-0094, version 1")
    assert "ISO 648:2008 class A, 10 mL" in fields["Acceptance criteria"][0]
    assert "simple acceptance" in fields["Acceptance criteria"][0]
    assert "Balance B-2, NM-B-20417, version 1" in fields["Reference materials"][0]
    assert fields["Next due"][1] == "stated"
    assert {state for _, state in fields.values()} <= {"stated", "not applicable", "missing"}


def test_instrument_shows_verdict_rows_with_specification_and_decision_rule(demo) -> None:
    page = demo.read(open_instrument, id_of(demo, "Piston burette P-25"), who="bashir")
    (calibration,) = page.calibrations
    assert calibration.verdict == "holds"
    judged = [one for one in calibration.checks if one.rule]
    assert {one.rule for one in judged} == {"simple acceptance"}
    assert all("ISO 8655-3:2002, 25 mL" in one.basis for one in judged)
    assert calibration.curve.startswith("<svg")
    assert calibration.table.caption == "Correction, added to the reading"
    assert calibration.table.heads == ("reading, mL", "added, mL")


def test_balance_shows_its_checks_on_a_chart_and_line_by_line(demo) -> None:
    page = demo.read(open_instrument, id_of(demo, "Balance B-2"), who="bashir")
    (chart,) = page.charts
    assert chart.name == "100 g, W-3"
    assert "warning ±" in chart.says
    assert "Beyond the warning limit: 29 Oct 2026" in chart.picture
    assert chart.last_verdict == "holds"
    assert page.flag == ""
    assert {line.what for line in page.lines} == {"check weight", "check weighing"}
    struck = {line.what: line.may_strike for line in page.lines}
    # an analyst strikes checks, a keeper limits as well
    assert struck == {"check weight": False, "check weighing": True}


def test_flask_says_that_its_class_tolerance_is_no_run(demo) -> None:
    page = demo.read(open_instrument, id_of(demo, "Flask F-1000"), who="bashir")
    (calibration,) = page.calibrations
    assert (calibration.verdict, calibration.has_run) == ("", False)
    stated = {fact.label: fact.value for fact in calibration.facts}["Volume at 20 °C"]
    # ISO 1042:1998, 1000 mL class A: ± 0.4 mL
    assert stated.startswith("1000 mL, ± 0.4 mL (triangular)")
    assert "no gravimetric run" in stated


def test_calibration_page_shows_every_reading_as_typed(demo) -> None:
    thing = id_of(demo, "Pipette V-10")
    page = demo.read(open_calibration, thing, 1, who="bashir")
    assert page.calibration.serves
    assert [row[:2] for row in page.run.rows] == [
        tuple(f"{one['before']} {one['after']}".split()) for one in runs.PIPETTE_RUN["weighings"]
    ]
    assert page.run.budget_of == "the mean"
    with pytest.raises(NotFound):
        demo.read(open_calibration, thing, 2, who="bashir")


def test_instrument_shows_its_calibration_digit_by_digit(demo) -> None:
    page = demo.read(open_instrument, id_of(demo, "Balance B-2"), who="jonas")
    (calibration,) = page.calibrations
    assert calibration.serves
    facts = {fact.label: fact.value for fact in calibration.facts}
    assert facts["Linearity of one reading"] == "± 0.00015 g (rectangular)"
    assert calibration.table.rows[-1] == ("200", "-0.0002")
    assert (page.may_keep, page.may_hold, page.may_release) == (True, True, False)


def test_instrument_newest_calibration_serves_and_old_ones_stay(own_demo) -> None:
    jonas, thing = own_demo.people["jonas"], id_of(own_demo, "Piston burette P-20")
    command = RecordCalibration(
        thing, "TB-G-0101", "own", "2026-11-30", "2027-05-31", "6 months",
        {"capacity": {"value": "20", "unit": "mL"},
         "delivery": {"unit": "mL", "half_width": "0.02", "shape": "triangular"},
         "glass_expansion": "9.9e-6"},
    )  # fmt: skip
    own_demo.write(lambda s: record_calibration(s, command, actor=jonas, now=own_demo.now))
    page = own_demo.read(open_instrument, thing, who="jonas")
    assert [(one.version, one.state, one.serves) for one in page.calibrations] == [
        (2, "in date", True),
        (1, "replaced", False),
    ]
    facts = {fact.label: fact.value for fact in page.calibrations[0].facts}
    assert facts["Cubic expansion of the glass"] == "9.9e-6 /K"
    assert page.state == "in date"


def test_instrument_without_a_calibration_says_so(own_demo) -> None:
    jonas = own_demo.people["jonas"]
    command = RegisterInstrument(
        "thermometer", "T-9 <i>", "Kvist", "probe", "9", "Bench 1", resolution="0.1"
    )
    thing = own_demo.write(lambda s: register_instrument(s, command, actor=jonas, now=own_demo.now))
    page = own_demo.read(open_instrument, thing, who="jonas")
    assert (page.name, page.state, page.calibrations) == ("T-9 <i>", "not calibrated", ())
    assert own_demo.read(open_instruments, who="jonas").instruments[-1].state == "not calibrated"


def test_instrument_unknown_is_not_found_and_visitors_sign_in(demo) -> None:
    with pytest.raises(NotFound):
        demo.read(open_instrument, "none", who="jonas")
    with pytest.raises(NotSignedIn):
        demo.read(open_instruments, who=None)
