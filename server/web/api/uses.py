"""What bottles were used for: recorded by people and scripts; bottles opened and moved."""

from typing import Annotated

from fastapi import APIRouter, Depends, Response

from server.procedures.bottles import MoveBottle, OpenBottle, move_bottle, open_bottle
from server.procedures.uses import StrikeUse, UseBottle, strike_use, use_bottle
from server.sheets.uses_page import open_uses_of_bottle, open_uses_of_lot
from server.web.api.desk import AtApi, answer
from server.web.bodies import Given, body_of
from server.web.visits import AtDesk

router = APIRouter(tags=["shelf"])
_MOVE, _USE = body_of(MoveBottle, "code"), body_of(UseBottle, "code")
_STRIKE = body_of(StrikeUse, "code", "use_id")


@router.get("/bottles/{code}/uses")
def uses_of_bottle(visit: AtDesk, code: str) -> Response:
    """List what a bottle was used for, used last first."""
    return answer(visit.read(open_uses_of_bottle, code))


@router.get("/lots/{code}/uses")
def uses_of_lot(visit: AtDesk, code: str, since: str = "") -> Response:
    """List what the bottles of a lot were used for, ``since`` a day where one is given."""
    return answer(visit.read(open_uses_of_lot, code, since=since))


@router.post("/bottles/{code}/uses", openapi_extra=_USE.openapi, status_code=201)
def use(desk: AtApi, code: str, given: Annotated[Given, Depends(_USE)]) -> Response:
    """Write down a result that rests on a bottle; the same again is written once.

    The answer holds the line as it stands: with which certificate, and the bottle's state then.
    """
    visit = desk.visit
    token_id = visit.bearer.token_id if visit.bearer else None
    made = desk.act(use_bottle, UseBottle(code=code, **given), token_id=token_id)
    view = visit.read(open_uses_of_bottle, code)
    line = next(one for one in view.uses if one.id == made)
    return answer(line, status=201)


@router.post("/bottles/{code}/uses/{use_id}/strike", openapi_extra=_STRIKE.openapi)
def strike(
    desk: AtApi, code: str, use_id: str, given: Annotated[Given, Depends(_STRIKE)]
) -> Response:
    """Strike a use through that was written by mistake; it stays readable."""
    desk.act(strike_use, StrikeUse(code=code, use_id=use_id, **given))
    return answer({"id": use_id, "struck": True})


@router.post("/bottles/{code}/opened")
def opened(desk: AtApi, code: str) -> Response:
    """Write down that a bottle was opened."""
    desk.act(open_bottle, OpenBottle(code))
    return answer({"bottle": code, "opened": True})


@router.post("/bottles/{code}/moved", openapi_extra=_MOVE.openapi)
def moved(desk: AtApi, code: str, given: Annotated[Given, Depends(_MOVE)]) -> Response:
    """Write down where a bottle stands now."""
    desk.act(move_bottle, MoveBottle(code=code, **given))
    return answer({"bottle": code, "place": given["place"]})
