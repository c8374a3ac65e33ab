"""The curves of a sheet over the API."""

from typing import Annotated

from fastapi import APIRouter, Path, Response

from server.sheets.curve_page import curve_chart, curve_document, read_curve
from server.web.api.desk import answer
from server.web.visits import AtDesk

router = APIRouter(tags=["sheets"])
Replicate = Annotated[int, Path(ge=1, le=99)]


@router.get("/sheets/{sheet_id}/curves/{replicate}")
def curve(visit: AtDesk, sheet_id: str, replicate: Replicate) -> Response:
    """Tell a curve as it was written, with what every method finds on it (equivalence/1)."""
    return answer(curve_document(visit.read(read_curve, sheet_id, replicate)))


@router.get("/sheets/{sheet_id}/curves/{replicate}/chart")
def chart(visit: AtDesk, sheet_id: str, replicate: Replicate) -> Response:
    """Tell a curve's numbers as the chart script takes them: floats of 4 bytes in base64."""
    text = curve_chart(visit.read(read_curve, sheet_id, replicate))
    return Response(text, media_type="application/json")
