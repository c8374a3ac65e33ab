"""The trail as a page."""

from fastapi import APIRouter, Response

from server.sheets.trail_page import open_trail
from server.web.showing import show
from server.web.visits import AtDesk

router = APIRouter()


@router.get("/trail")
def trail(
    visit: AtDesk, person: str = "", thing: str = "", day: str = "", page: str = "1"
) -> Response:
    """Show what was done, newest first, and whether the chain holds."""
    return show(
        visit,
        "trail/home.html",
        lambda session, **who: open_trail(
            session, person=person, thing=thing, day=day, page=page_number(page), **who
        ),
    )


def page_number(text: str) -> int:
    """Return which page is asked for; the first where it cannot be told."""
    return max(1, int(text)) if text.isascii() and text.isdigit() and len(text) < 8 else 1
