"""The trail as a page."""

from typing import Any

from fastapi import APIRouter, Response

from server.reports.trail_record import trail_json_lines
from server.sheets.trail_list import open_trail_record
from server.sheets.trail_page import open_trail
from server.web.pages.files import attachment
from server.web.showing import show
from server.web.visits import AtDesk

router = APIRouter()


@router.get("/trail")
def trail(
    visit: AtDesk,
    person: str = "",
    thing: str = "",
    day: str = "",
    words: str = "",
    page: str = "1",
) -> Response:
    """Show what was done, newest first, and whether the chain holds."""
    asked: dict[str, Any] = {"person": person, "thing": thing, "day": day, "words": words}
    return show(
        visit,
        "trail/home.html",
        lambda session, **who: open_trail(session, **asked, page=page_number(page), **who),
    )


@router.get("/trail/list.jsonl")
def record(
    visit: AtDesk, person: str = "", thing: str = "", day: str = "", words: str = ""
) -> Response:
    """Hand out the trail as it is kept, oldest first, one row a line."""
    found = visit.read(open_trail_record, person=person, thing=thing, day=day, words=words)
    name = f"trail-{visit.now:%Y-%m-%d}.jsonl"
    return attachment(trail_json_lines(found), name, "application/jsonl; charset=utf-8")


def page_number(text: str) -> int:
    """Return which page is asked for; the first where it cannot be told."""
    return max(1, int(text)) if text.isascii() and text.isdigit() and len(text) < 8 else 1
