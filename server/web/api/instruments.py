"""Instruments, their calibrations and checks over the API."""

from dataclasses import dataclass, field, replace
from typing import Annotated, Any

from fastapi import APIRouter, Depends, Path, Query, Response

from server.intake.calibration_file import Asked, read_calibration_file
from server.intake.kept_files import read_original
from server.procedures.calibration_files import HandOver, hand_over
from server.procedures.calibration_runs import (
    RecordRun,
    StateClass,
    record_run,
    state_class,
    weighed_with,
)
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
    DescribeInstrument,
    RecordCalibration,
    RegisterInstrument,
    describe_instrument,
    record_calibration,
    register_instrument,
)
from server.sheets.import_page import import_page, open_import_start, read_original_of
from server.sheets.instruments_page import open_calibration, open_instrument, open_instruments
from server.sheets.run_form import AskedRun, judge_preview, read_run
from server.web.api.desk import AtApi, answer, made
from server.web.bodies import Given, JsonBody, body_of, model_of
from server.web.visits import AtDesk

router = APIRouter(tags=["instruments"])
_BY = "instrument_id"
_REGISTER, _RECORD = body_of(RegisterInstrument), body_of(RecordCalibration, _BY)
_DESCRIBE, _CLASS = body_of(DescribeInstrument, _BY), body_of(StateClass, _BY)
_RUN, _LIMITS = body_of(RecordRun, _BY), body_of(SetLimits, _BY)
_CHECK, _STRIKE = body_of(WriteCheck, _BY), body_of(StrikeLine, _BY, "line_id")
_DROP = body_of(MeasureDrop, _BY)
_HAND_OVER = body_of(HandOver, _BY, sheet=(str, ""), means=(str, ""), table=(str, ""))
Words = Annotated[str, Query(max_length=200)]
Version = Annotated[int, Path(ge=1, le=2**31 - 1)]


@dataclass(frozen=True, slots=True)
class _Preview:
    """A run as it stands, to be worked out and not recorded."""

    run: dict[str, Any] = field(default_factory=dict)
    balance_id: str = ""
    thermometer_id: str = ""
    room_id: str = ""


_WORK_OUT = JsonBody(model_of(_Preview))


def _url(instrument_id: str) -> str:
    return f"/api/instruments/{instrument_id}"


@router.get("/instruments")
def instruments(visit: AtDesk) -> Response:
    """List the instruments with the state of their calibrations."""
    return answer(visit.read(open_instruments))


@router.post("/instruments", openapi_extra=_REGISTER.openapi, status_code=201)
def register(desk: AtApi, given: Annotated[Given, Depends(_REGISTER)]) -> Response:
    """Register an instrument."""
    made_id = desk.act(register_instrument, RegisterInstrument(**given))
    return made(_url(made_id), id=made_id)


@router.get("/instruments/{instrument_id}")
def instrument(visit: AtDesk, instrument_id: str) -> Response:
    """Tell an instrument with its calibrations and the checks between them."""
    return answer(visit.read(open_instrument, instrument_id))


@router.post("/instruments/{instrument_id}/identity", openapi_extra=_DESCRIBE.openapi)
def describe(
    desk: AtApi, instrument_id: str, given: Annotated[Given, Depends(_DESCRIBE)]
) -> Response:
    """Describe an instrument anew, with the reason."""
    desk.act(describe_instrument, DescribeInstrument(instrument_id=instrument_id, **given))
    return answer(desk.visit.read(open_instrument, instrument_id))


@router.post(
    "/instruments/{instrument_id}/calibrations", openapi_extra=_RECORD.openapi, status_code=201
)
def record(desk: AtApi, instrument_id: str, given: Annotated[Given, Depends(_RECORD)]) -> Response:
    """Record a calibration; it serves from now on."""
    command = RecordCalibration(instrument_id=instrument_id, **given)
    return made(_url(instrument_id), id=desk.act(record_calibration, command))


@router.get("/instruments/{instrument_id}/calibrations/{version}")
def calibration(visit: AtDesk, instrument_id: str, version: Version) -> Response:
    """Tell one calibration with the readings that it came from."""
    return answer(visit.read(open_calibration, instrument_id, version))


@router.post("/instruments/{instrument_id}/runs", openapi_extra=_RUN.openapi, status_code=201)
def run(desk: AtApi, instrument_id: str, given: Annotated[Given, Depends(_RUN)]) -> Response:
    """Record a calibration done here; it serves from now on."""
    command = RecordRun(instrument_id=instrument_id, **given)
    return made(_url(instrument_id), id=desk.act(record_run, command))


@router.post("/instruments/{instrument_id}/runs/preview", openapi_extra=_WORK_OUT.openapi)
def preview(
    desk: AtApi, instrument_id: str, given: Annotated[Given, Depends(_WORK_OUT)]
) -> Response:
    """Work a run out as far as it goes; nothing is recorded."""
    picked = weighed_with(_Preview(**given))
    asked = AskedRun(instrument_id, given["run"], picked)
    return answer(judge_preview(desk.visit.read(read_run, asked)))


@router.post("/instruments/{instrument_id}/class", openapi_extra=_CLASS.openapi, status_code=201)
def serve_class(
    desk: AtApi, instrument_id: str, given: Annotated[Given, Depends(_CLASS)]
) -> Response:
    """Let a class tolerance serve, as a calibration that says so."""
    command = StateClass(instrument_id=instrument_id, **given)
    return made(_url(instrument_id), id=desk.act(state_class, command))


@router.post("/instruments/{instrument_id}/imports", openapi_extra=_HAND_OVER.openapi,
             status_code=201)  # fmt: skip
def take_file(
    desk: AtApi, instrument_id: str, given: Annotated[Given, Depends(_HAND_OVER)]
) -> Response:
    """Take a calibration's file, once it can be read; nothing counts before it is confirmed."""
    asked = Asked(*(given.pop(name) for name in ("sheet", "means", "table")))
    start = desk.visit.read(open_import_start, instrument_id)
    original = read_original(given["file_name"], given["content_base64"])
    read_calibration_file(original.content, start.kind, asked)
    file_id = desk.act(hand_over, HandOver(instrument_id=instrument_id, **given))
    url = f"{_url(instrument_id)}/imports/{file_id}"
    return made(url, id=file_id, sha256=original.sha256)


@router.get("/instruments/{instrument_id}/imports/{file_id}")
def proposal(
    visit: AtDesk,
    instrument_id: str,
    file_id: str,
    sheet: Words = "",
    means: Words = "",
    table: Words = "",
) -> Response:
    """Tell what a file says, to be confirmed by recording a calibration with its ``file_id``."""
    read = visit.read(read_original_of, instrument_id, file_id)
    return answer(import_page(read, Asked(sheet, means, table)))


@router.post("/instruments/{instrument_id}/limits", openapi_extra=_LIMITS.openapi, status_code=201)
def limits(desk: AtApi, instrument_id: str, given: Annotated[Given, Depends(_LIMITS)]) -> Response:
    """Set the limits of a check."""
    command = SetLimits(instrument_id=instrument_id, **given)
    return made(_url(instrument_id), id=desk.act(set_limits, command))


@router.post("/instruments/{instrument_id}/checks", openapi_extra=_CHECK.openapi, status_code=201)
def check(desk: AtApi, instrument_id: str, given: Annotated[Given, Depends(_CHECK)]) -> Response:
    """Write a check down, whatever it says."""
    command = WriteCheck(instrument_id=instrument_id, **given)
    line = desk.act(write_check, command)
    after = replace(desk.visit, now=desk.visit.parts.clock())
    page = after.read(open_instrument, instrument_id)
    return made(_url(instrument_id), id=line, flag=page.flag)


@router.post("/instruments/{instrument_id}/drops", openapi_extra=_DROP.openapi, status_code=201)
def drop(desk: AtApi, instrument_id: str, given: Annotated[Given, Depends(_DROP)]) -> Response:
    """Write the volume of a burette's drop down."""
    command = MeasureDrop(instrument_id=instrument_id, **given)
    return made(_url(instrument_id), id=desk.act(measure_drop, command))


@router.post("/instruments/{instrument_id}/log/{line_id}/strike", openapi_extra=_STRIKE.openapi)
def strike(
    desk: AtApi, instrument_id: str, line_id: str, given: Annotated[Given, Depends(_STRIKE)]
) -> Response:
    """Strike a line of the log through."""
    command = StrikeLine(instrument_id=instrument_id, line_id=line_id, **given)
    desk.act(strike_check, command)
    return answer(desk.visit.read(open_instrument, instrument_id))
