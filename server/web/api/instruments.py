"""Instruments and calibrations over the API."""

from typing import Annotated

from fastapi import APIRouter, Depends, Response

from server.procedures.instruments import (
    RecordCalibration,
    RegisterInstrument,
    record_calibration,
    register_instrument,
)
from server.sheets.instruments_page import open_instrument, open_instruments
from server.web.api.desk import AtApi, answer, made
from server.web.bodies import Given, body_of
from server.web.visits import AtDesk

router = APIRouter(tags=["instruments"])
_REGISTER, _RECORD = body_of(RegisterInstrument), body_of(RecordCalibration, "instrument_id")


@router.get("/instruments")
def instruments(visit: AtDesk) -> Response:
    """List the instruments with the state of their calibrations."""
    return answer(visit.read(open_instruments))


@router.post("/instruments", openapi_extra=_REGISTER.openapi, status_code=201)
def register(desk: AtApi, given: Annotated[Given, Depends(_REGISTER)]) -> Response:
    """Register an instrument."""
    made_id = desk.act(register_instrument, RegisterInstrument(**given))
    return made(f"/api/instruments/{made_id}", id=made_id)


@router.get("/instruments/{instrument_id}")
def instrument(visit: AtDesk, instrument_id: str) -> Response:
    """Tell an instrument with its calibrations."""
    return answer(visit.read(open_instrument, instrument_id))


@router.post(
    "/instruments/{instrument_id}/calibrations", openapi_extra=_RECORD.openapi, status_code=201
)
def record(desk: AtApi, instrument_id: str, given: Annotated[Given, Depends(_RECORD)]) -> Response:
    """Record a calibration; it serves from now on."""
    command = RecordCalibration(instrument_id=instrument_id, **given)
    return made(f"/api/instruments/{instrument_id}", id=desk.act(record_calibration, command))
