"""The trail over the API."""

from fastapi import APIRouter, Response

from server.sheets.trail_page import open_trail
from server.web.api.desk import answer
from server.web.pages.trail import page_number
from server.web.visits import AtDesk

router = APIRouter(tags=["trail"])


@router.get("/trail")
def trail(
    visit: AtDesk,
    person: str = "",
    thing: str = "",
    day: str = "",
    words: str = "",
    page: str = "1",
) -> Response:
    """Tell what was done, newest first, and whether the chain holds."""
    asked = {"person": person, "thing": thing, "day": day, "words": words}
    return answer(visit.read(open_trail, **asked, page=page_number(page)))
