"""Titrant lots over the API; holding and releasing."""

from typing import Annotated

from fastapi import APIRouter, Depends, Response

from server.procedures.holds import HoldThing, ReleaseThing, hold_thing, release_thing
from server.procedures.lots import (
    ConfirmPull,
    FillBottles,
    MakeUpLot,
    ProposePull,
    confirm_pull,
    fill_bottles,
    make_up_lot,
    propose_pull,
)
from server.sheets.lot_page import open_lot
from server.sheets.lots_page import open_lots
from server.sheets.methods_page import open_methods
from server.web.api.desk import AtApi, answer, made
from server.web.bodies import Given, body_of
from server.web.handing_out import hand_out_lot
from server.web.pages.lots import ToCompare
from server.web.visits import AtDesk

router = APIRouter(tags=["lots"])
_MAKE_UP, _FILL = body_of(MakeUpLot), body_of(FillBottles, "lot_code")
_PROPOSE = body_of(ProposePull, "lot_code")
_HOLD, _RELEASE = body_of(HoldThing), body_of(ReleaseThing)


@router.post("/lots", openapi_extra=_MAKE_UP.openapi, status_code=201)
def make_up(desk: AtApi, given: Annotated[Given, Depends(_MAKE_UP)]) -> Response:
    """Keep a lot that was made up."""
    code = desk.act(make_up_lot, MakeUpLot(**given))
    return made(f"/api/lots/{code}", code=code)


@router.get("/lots")
def lots(visit: AtDesk, state: str = "", titrant: str = "") -> Response:
    """List the lots, due soonest first; ``state`` and ``titrant`` keep those that have them."""
    return answer(visit.read(open_lots, state=state, titrant=titrant))


@router.get("/lots/{code}")
def lot(visit: AtDesk, code: str) -> Response:
    """Tell one lot: preparation, bottles, sheets, certificates."""
    return answer(visit.read(open_lot, code))


@router.get("/lots/{code}/methods")
def methods(visit: AtDesk, code: str, asked: ToCompare) -> Response:
    """Tell the end-point methods of a lot side by side, over its evaluated sheets.

    Asked by ``sheet`` (a number; several are allowed, none means all), ``reference`` (mol/L) and
    ``reference_U`` (k = 2).
    """
    return answer(visit.read(open_methods, code, asked))


@router.get("/lots/{code}/export.zip", response_class=Response)
def export(visit: AtDesk, code: str) -> Response:
    """Hand out all of a lot in one archive: certificates, record, trail, files, manifest."""
    return hand_out_lot(visit, code)


@router.post("/lots/{code}/bottles", openapi_extra=_FILL.openapi, status_code=201)
def fill(desk: AtApi, code: str, given: Annotated[Given, Depends(_FILL)]) -> Response:
    """Fill bottles from a lot."""
    codes = desk.act(fill_bottles, FillBottles(lot_code=code, **given))
    return made(f"/api/lots/{code}", bottles=list(codes))


@router.post("/lots/{code}/propose-pull", openapi_extra=_PROPOSE.openapi)
def propose(desk: AtApi, code: str, given: Annotated[Given, Depends(_PROPOSE)]) -> Response:
    """Propose to take a lot out of use for good."""
    return answer({"id": desk.act(propose_pull, ProposePull(lot_code=code, **given))})


@router.post("/lots/{code}/confirm-pull")
def confirm(desk: AtApi, code: str) -> Response:
    """Take a lot out of use for good, as somebody else proposed."""
    desk.act(confirm_pull, ConfirmPull(code))
    return answer({"lot": code, "state": "pulled"})


@router.post("/holds", openapi_extra=_HOLD.openapi, status_code=201)
def hold(desk: AtApi, given: Annotated[Given, Depends(_HOLD)]) -> Response:
    """Hold a lot, bottle, standard lot or instrument that somebody doubts."""
    return answer({"id": desk.act(hold_thing, HoldThing(**given))}, status=201)


@router.post("/releases", openapi_extra=_RELEASE.openapi)
def release(desk: AtApi, given: Annotated[Given, Depends(_RELEASE)]) -> Response:
    """Release what somebody else held."""
    desk.act(release_thing, ReleaseThing(**given))
    return answer({"thing": given["thing"], "state": "released"})
