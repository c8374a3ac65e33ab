"""Countersigning over the API."""

from typing import Annotated, Any

from fastapi import APIRouter, Depends, Response

from server.procedures.countersign import Countersign
from server.procedures.send_back import SendBack, send_back_sheet
from server.sheets.countersigning import open_countersign
from server.sheets.queue import open_queue
from server.web.api.desk import AtApi, answer
from server.web.bodies import Given, body_of
from server.web.signing import Given as Signer
from server.web.signing import set_second_signature
from server.web.visits import AtDesk

router = APIRouter(tags=["countersign"])
_SIGN = body_of(Countersign, "sheet_id", password=str, name=(str, ""))
_BACK = body_of(SendBack, "sheet_id")


@router.get("/countersign")
def queue(visit: AtDesk) -> Response:
    """List the sheets that wait for a second person, longest first."""
    return answer(visit.read(open_queue))


@router.get("/sheets/{sheet_id}/countersign")
def sheet(visit: AtDesk, sheet_id: str) -> Response:
    """Tell one sheet as a second person reads it."""
    return answer(visit.read(open_countersign, sheet_id))


@router.post("/sheets/{sheet_id}/countersign", openapi_extra=_SIGN.openapi)
def sign(desk: AtApi, sheet_id: str, given: Annotated[Given, Depends(_SIGN)]) -> Response:
    """Countersign a sheet; its certificate is issued.

    The password is asked again, and at the first signature of a session the sign-in name too.
    """
    signer = Signer(given.pop("name"), given.pop("password"))
    command = Countersign(sheet_id=sheet_id, **given)
    told: Any = set_second_signature(desk.visit, command, signer, key=desk.key)
    return answer(told)


@router.post("/sheets/{sheet_id}/send-back", openapi_extra=_BACK.openapi)
def send_back(desk: AtApi, sheet_id: str, given: Annotated[Given, Depends(_BACK)]) -> Response:
    """Send a sheet back to the bench with a remark, remarks on rows, or both."""
    revision = desk.act(send_back_sheet, SendBack(sheet_id=sheet_id, **given))
    return answer({"id": sheet_id, "revision": revision})
