"""Labels of bottles over the API."""

from dataclasses import asdict
from typing import Annotated

from fastapi import APIRouter, Depends, Request, Response

from server.procedures.labels import PrintLabels
from server.sheets.labels_page import open_label_job, open_labels
from server.web.api.desk import AtApi, answer, made
from server.web.bodies import Given, body_of
from server.web.handing_out import hand_out_labels, show_labels
from server.web.label_prints import print_them
from server.web.pages.labels import own_address
from server.web.visits import AtDesk

router = APIRouter(tags=["labels"])
_PRINT = body_of(PrintLabels, "base_url")


@router.get("/labels")
def labels(visit: AtDesk, thing: str = "") -> Response:
    """Tell the labels of a lot or bottle; without ``thing`` those to be printed again."""
    return answer(visit.read(open_labels, thing))


@router.post("/labels", openapi_extra=_PRINT.openapi, status_code=201)
def print_out(request: Request, desk: AtApi, given: Annotated[Given, Depends(_PRINT)]) -> Response:
    """Print labels for bottles; a label that was printed before needs a reason."""
    command = PrintLabels(**given, base_url=own_address(request))
    number = print_them(desk.visit, command, key=desk.key)
    return made(f"/api/labels/{number}", number=number)


@router.get("/labels/{number}.pdf", response_class=Response)
def pdf(visit: AtDesk, number: int) -> Response:
    """Hand out the labels of a print as PDF."""
    return hand_out_labels(visit, number)


@router.get("/labels/{number}.png", response_class=Response)
def picture(visit: AtDesk, number: int, sheet: int = 1) -> Response:
    """Hand out a sheet of a print as PNG, a dot of the printer for a dot of the picture."""
    return show_labels(visit, number, sheet)


@router.get("/labels/{number}")
def one_print(visit: AtDesk, number: int) -> Response:
    """Tell one print: each label with all that it says, onto what, when and by whom."""
    job = asdict(visit.read(open_label_job, number))
    return answer({**job, "made_at": job["made_at"].isoformat()})
