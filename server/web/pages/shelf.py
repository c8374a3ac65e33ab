"""The shelf, and the page behind a bottle's label."""

from typing import Any

from fastapi import APIRouter, Request, Response
from starlette.concurrency import run_in_threadpool

from server.lab.refusal import NotFound
from server.procedures.lots import UseUpBottle, use_up_bottle
from server.sheets.bottle_card import open_bottle_card
from server.sheets.people import open_chrome
from server.sheets.shelf_page import open_shelf
from server.web.forms.posts import Posted, see_other
from server.web.headers import CAMERA_HERE
from server.web.pages.session import is_set_up
from server.web.parts import parts_of
from server.web.showing import draw
from server.web.visits import AtDesk, source_of, touch, visit_in

router = APIRouter()
#: Only where a code may be scanned may this site's own page ask for the camera.
_CAMERA = {"Permissions-Policy": CAMERA_HERE}


@router.get("/")
def shelf(
    visit: AtDesk, words: str = "", state: str = "", titrant: str = "", place: str = ""
) -> Response:
    """Show the shelf; the code of a bottle leads to its card.

    Before the first day, the page that sets the laboratory up.
    """
    if visit.actor is None and not is_set_up(visit):
        return see_other("/setup")
    asked = {"words": words, "state": state, "titrant": titrant, "place": place}
    page, chrome = visit.parts.transactions.read(
        lambda session: (
            open_shelf(session, actor=visit.actor, now=visit.now, **asked),
            open_chrome(session, actor=visit.actor, now=visit.now),
        )
    )
    if page.only:
        return see_other(f"/b/{page.only}")
    return draw(visit, "shelf/home.html", page, chrome, headers=_CAMERA)


@router.get("/b/{code}")
@router.get("/B/{code}")
async def bottle(request: Request, code: str, at: str | None = None) -> Response:
    """Show one bottle: the page behind the label."""
    parts = parts_of(request)
    now = parts.clock()

    def work(session: Any) -> Response:
        visit, to_touch = visit_in(session, request, now=now)
        request.state.visit = visit
        request.state.to_touch = to_touch
        who: dict[str, Any] = {"actor": visit.actor, "now": now}
        page = open_bottle_card(session, code, at=at or None, **who)
        chrome = open_chrome(session, **who)
        return draw(visit, "shelf/bottle.html", page, chrome, headers=_CAMERA)

    try:
        response = parts.transactions.read(work)
    except NotFound:
        parts.unknown_codes.count(source_of(request), now=now)
        raise
    if request.state.to_touch:
        await run_in_threadpool(touch, request.state.visit)
    return response


@router.post("/b/{code}/used-up")
def use_up(post: Posted, code: str) -> Response:
    """Write down that a bottle is empty."""

    def work() -> str:
        post.act(use_up_bottle, UseUpBottle(code))
        return f"/b/{code}"

    return post.answer(work)
