"""Instruments by state, and one with its calibrations."""

import pytest
import sqlalchemy as sa

from server.lab.refusal import NotFound, NotSignedIn
from server.procedures.instruments import (
    RecordCalibration,
    RegisterInstrument,
    record_calibration,
    register_instrument,
)
from server.records.tables.stores import Instrument
from server.sheets.instruments_page import open_instrument, open_instruments


def id_of(demo, name):
    asked = sa.select(Instrument.id).where(Instrument.name == name)
    return demo.transactions.read(lambda s: s.scalar(asked))


def test_instruments_stand_by_state_with_their_due_day(demo) -> None:
    page = demo.read(open_instruments, who="bashir")
    assert [(line.name, line.state) for line in page.instruments] == [
        ("Room monitor R-1", "due soon"),
        ("Balance B-2", "in date"),
        ("Piston burette P-25", "in date"),
        ("Thermometer T-7", "in date"),
        ("Piston burette P-20", "lapsed"),
    ]
    assert page.instruments[4].due == "25 Nov 2026"
    assert not page.may_keep


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
