"""Looking a bottle up: the number that its label stands for."""

from typing import Any

from fastapi import APIRouter, Request, Response
from fastapi.responses import PlainTextResponse
from starlette.concurrency import run_in_threadpool

from server.lab.refusal import NotFound
from server.procedures.lots import UseUpBottle, use_up_bottle
from server.sheets.look_up import look_up
from server.sheets.shelf_page import open_shelf
from server.web.api.desk import AtApi, answer
from server.web.parts import parts_of
from server.web.visits import AtDesk, source_of, touch, visit_in

router = APIRouter(tags=["shelf"])


@router.get("/bottles/{code}")
async def bottle(request: Request, code: str, at: str | None = None) -> Response:
    """Tell the number of a bottle, or why it has none; ``at`` is a temperature of use in °C.

    ``Accept: text/plain`` answers with number and unit on one line, at that temperature if asked.
    """
    parts = parts_of(request)
    now = parts.clock()

    def work(session: Any) -> tuple[Any, Any]:
        visit, to_touch = visit_in(session, request, now=now)
        request.state.visit = visit
        found = look_up(session, code, at=at or None, now=now, actor=visit.actor)
        return found, visit if to_touch else None

    try:
        found, seen = parts.transactions.read(work)
    except NotFound:
        parts.unknown_codes.count(source_of(request), now=now)
        raise
    if seen is not None:
        await run_in_threadpool(touch, seen)
    return PlainTextResponse(one_line(found)) if wants_text(request) else answer(found)


@router.get("/shelf")
def shelf(
    visit: AtDesk, words: str = "", state: str = "", titrant: str = "", place: str = ""
) -> Response:
    """List the bottles, due soonest first."""
    asked = {"words": words, "state": state, "titrant": titrant, "place": place}
    return answer(visit.read(open_shelf, **asked))


@router.post("/bottles/{code}/used-up")
def use_up(desk: AtApi, code: str) -> Response:
    """Write down that a bottle is empty."""
    desk.act(use_up_bottle, UseUpBottle(code))
    return answer({"bottle": code, "state": "used up"})


def one_line(found: dict[str, Any]) -> str:
    """Return number and unit on one line, or in words why there is no number."""
    concentration = found.get("at_temperature") or found["concentration"]
    if not found["in_force"] or concentration is None:
        return f"not in force: {found['state']}\n"
    return f"{concentration['reported'].split()[0]} {concentration['unit']}\n"


def wants_text(request: Request) -> bool:
    """Say whether a request asks for one line of text instead of JSON."""
    accept = request.headers.get("accept", "")
    return "text/plain" in accept and "json" not in accept
