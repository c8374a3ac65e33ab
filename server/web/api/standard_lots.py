"""The life of a standard lot over the API."""

from collections.abc import Callable
from typing import Annotated, Any

from fastapi import APIRouter, Depends, Response

from server.procedures.standard_lots import (
    AttachCertificate,
    CountStandardLot,
    OpenStandardLot,
    RecordDrying,
    RecordRetest,
    RecordUse,
    StrikeLotLine,
    attach_certificate,
    count_lot,
    open_lot,
    record_drying,
    record_retest,
    record_use,
    strike_lot_line,
)
from server.web.api.desk import AtApi, Desk, answer, made
from server.web.bodies import Given, body_of

router = APIRouter(tags=["stores"])
_LOT = "standard_lot_id"
_OPENED, _DRYING, _USE = (body_of(one, _LOT) for one in (OpenStandardLot, RecordDrying, RecordUse))
_COUNT, _RETEST = body_of(CountStandardLot, _LOT), body_of(RecordRetest, _LOT)
_STRIKE, _CERTIFICATE = body_of(StrikeLotLine, _LOT), body_of(AttachCertificate, _LOT)


def _written(desk: Desk, act: Callable[..., Any], command: Any) -> Response:
    line_id = desk.act(act, command)
    return made(f"/api/standard-lots/{command.standard_lot_id}", id=line_id)


@router.post(
    "/standard-lots/{standard_lot_id}/opened", openapi_extra=_OPENED.openapi, status_code=201
)
def opened(
    desk: AtApi, standard_lot_id: str, given: Annotated[Given, Depends(_OPENED)]
) -> Response:
    """Write that a lot was opened."""
    return _written(desk, open_lot, OpenStandardLot(standard_lot_id, **given))


@router.post(
    "/standard-lots/{standard_lot_id}/dryings", openapi_extra=_DRYING.openapi, status_code=201
)
def dried(desk: AtApi, standard_lot_id: str, given: Annotated[Given, Depends(_DRYING)]) -> Response:
    """Write a drying."""
    return _written(desk, record_drying, RecordDrying(standard_lot_id, **given))


@router.post("/standard-lots/{standard_lot_id}/uses", openapi_extra=_USE.openapi, status_code=201)
def used(desk: AtApi, standard_lot_id: str, given: Annotated[Given, Depends(_USE)]) -> Response:
    """Write a use that no sheet holds."""
    return _written(desk, record_use, RecordUse(standard_lot_id, **given))


@router.post(
    "/standard-lots/{standard_lot_id}/counts", openapi_extra=_COUNT.openapi, status_code=201
)
def counted(
    desk: AtApi, standard_lot_id: str, given: Annotated[Given, Depends(_COUNT)]
) -> Response:
    """Write how much is there by weighing it."""
    return _written(desk, count_lot, CountStandardLot(standard_lot_id, **given))


@router.post(
    "/standard-lots/{standard_lot_id}/retests", openapi_extra=_RETEST.openapi, status_code=201
)
def retested(
    desk: AtApi, standard_lot_id: str, given: Annotated[Given, Depends(_RETEST)]
) -> Response:
    """Write a re-test."""
    return _written(desk, record_retest, RecordRetest(standard_lot_id, **given))


@router.post("/standard-lots/{standard_lot_id}/strike", openapi_extra=_STRIKE.openapi)
def struck(
    desk: AtApi, standard_lot_id: str, given: Annotated[Given, Depends(_STRIKE)]
) -> Response:
    """Strike a line of a lot's log through."""
    command = StrikeLotLine(standard_lot_id, **given)
    desk.act(strike_lot_line, command)
    return answer({"id": command.line_id, "struck": True})


@router.post(
    "/standard-lots/{standard_lot_id}/certificate",
    openapi_extra=_CERTIFICATE.openapi,
    status_code=201,
)
def certificate(
    desk: AtApi, standard_lot_id: str, given: Annotated[Given, Depends(_CERTIFICATE)]
) -> Response:
    """Keep the file of a lot's certificate, given as base64."""
    file_id = desk.act(attach_certificate, AttachCertificate(standard_lot_id, **given))
    return made(f"/api/files/{file_id}", id=file_id)
