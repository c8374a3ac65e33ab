"""The page of a curve, and the part of it that the bench page's script fetches."""

from typing import Annotated

from fastapi import APIRouter, Path, Query, Response

from server.sheets.curve_page import curve_page, curve_part, read_curve
from server.web.headers import policy_with_styles
from server.web.showing import show
from server.web.visits import AtDesk

router = APIRouter()
Replicate = Annotated[int, Path(ge=1, le=99)]


@router.get("/sheets/{sheet_id}/curves/{replicate}")
def curve(
    visit: AtDesk,
    sheet_id: str,
    replicate: Replicate,
    first: Annotated[int | None, Query(ge=1)] = None,
) -> Response:
    """Show a curve with every method; the chart script comes after the page can be read."""
    bundle = visit.parts.chart_bundle
    return show(
        visit,
        "curves/curve.html",
        read_curve,
        sheet_id,
        replicate,
        first,
        finish=curve_page,
        headers={"Content-Security-Policy": policy_with_styles(bundle.style_hashes)},
        chart_script=bundle.url,
    )


@router.get("/sheets/{sheet_id}/curves/{replicate}/part")
def part(visit: AtDesk, sheet_id: str, replicate: Replicate) -> Response:
    """Return a curve as a part of a page."""
    return show(visit, "curves/part.html", read_curve, sheet_id, replicate, finish=curve_part)
