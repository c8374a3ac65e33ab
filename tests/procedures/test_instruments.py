from concurrent.futures import ThreadPoolExecutor

import pytest
from sqlalchemy import select

from server.lab.refusal import NotFound, Unacceptable
from server.procedures.instruments import (
    RecordCalibration,
    RegisterInstrument,
    record_calibration,
    register_instrument,
)
from server.records.tables.stores import Calibration, Instrument

LINEAR = {"linearity": {"unit": "g", "half_width": "0.00015", "shape": "rectangular"}}


def register(lab, **given):
    usual = {
        "kind": "balance", "name": "Balance B-2", "maker": "Holm", "type": "220 g",
        "serial": "17", "location": "Room 2", "resolution": "0.0001",
    }  # fmt: skip
    return lab.act(register_instrument, RegisterInstrument(**usual | given), "keeper")


def calibrate(lab, **given):
    usual = {
        "instrument_id": lab.balance, "certificate_number": "C-18", "issuer": "house",
        "done_on": "2026-05-04", "due_on": "2027-05-03", "due_basis": "12 months",
        "document": LINEAR,
    }  # fmt: skip
    return lab.act(record_calibration, RecordCalibration(**usual | given), "keeper")


def test_instrument_registered_keeps_its_identity_as_typed(lab):
    key = register(lab, capacity="220", minimum_g="0.020", decimals="", software=" 3.1 ")
    found = lab.transactions.read(lambda session: session.get(Instrument, key))
    assert found.document == {
        "maker": "Holm", "type": "220 g", "serial": "17", "location": "Room 2",
        "resolution": "0.0001", "capacity": "220", "minimum_g": "0.020", "software": "3.1",
    }  # fmt: skip
    assert lab.acts()[-1] == ("Nils Obermark", "registered an instrument", "instrument")


@pytest.mark.parametrize(
    ("given", "field"),
    [
        ({"kind": "stopwatch"}, "kind"),
        ({"name": "Balance B-1"}, "name"),
        ({"name": "a\0b"}, "name"),
        ({"resolution": ""}, "resolution"),
        ({"resolution": "0,0001"}, "resolution"),
        ({"resolution": "-0.0001"}, "resolution"),
        ({"capacity": "0"}, "capacity"),
        ({"minimum_g": "x"}, "minimum_g"),
        ({"decimals": "7"}, "decimals"),
        ({"decimals": "²"}, "decimals"),
        ({"decimals": "٣"}, "decimals"),
        ({"serial": "a\0b"}, "serial"),
        ({"maker": "x" * 201}, "maker"),
    ],
)
def test_instrument_odd_statement_is_refused_by_field(shared_lab, given, field):
    with pytest.raises(Unacceptable) as refused:
        register(shared_lab, **given)
    assert refused.value.field == field


def test_calibrations_recorded_at_once_get_versions_without_gaps(lab):
    with ThreadPoolExecutor(8) as pool:
        list(pool.map(lambda _: calibrate(lab), range(8)))
    asked = select(Calibration.version).where(Calibration.instrument_id == lab.balance)
    versions = lab.transactions.read(lambda session: session.scalars(asked).all())
    assert sorted(versions) == list(range(1, 10))


@pytest.mark.parametrize(
    ("given", "field"),
    [
        ({"done_on": "2026-05-05"}, "done_on"),
        ({"done_on": "2026-13-01"}, "done_on"),
        ({"due_on": "2026-05-03"}, "due_on"),
        ({"due_on": "9999-12-31"}, "due_on"),
        ({"issuer": ""}, "issuer"),
        ({"certificate_number": " "}, "certificate_number"),
        ({"due_basis": ""}, "due_basis"),
        ({"document": {}}, "document.linearity"),
        ({"document": LINEAR | {"capacity": "x"}}, "document.capacity"),
        ({"document": None}, "document"),
    ],
)
def test_calibration_odd_statement_is_refused_by_field(shared_lab, given, field):
    with pytest.raises(Unacceptable) as refused:
        calibrate(shared_lab, **given)
    assert refused.value.field == field


def test_calibration_of_an_unknown_instrument_is_not_found(shared_lab):
    with pytest.raises(NotFound):
        calibrate(shared_lab, instrument_id="x")
