"""Titrant lots: made up, filled into bottles, pulled; their end-point methods compared."""

from typing import Annotated, Any

from fastapi import APIRouter, Depends, Request, Response

from server.lab.refusal import Unacceptable
from server.procedures.lots import (
    ConfirmPull,
    ProposePull,
    confirm_pull,
    fill_bottles,
    make_up_lot,
    propose_pull,
)
from server.sheets.lot_page import open_lot, open_make_up
from server.sheets.lots_page import open_lots
from server.sheets.methods_page import MethodsAsked, open_methods
from server.web.forms.lots import read_fill, read_make_up
from server.web.forms.posts import Again, Posted
from server.web.handing_out import hand_out_lot
from server.web.showing import problem_of, show
from server.web.visits import AtDesk

router = APIRouter()
_METHODS = "lots/methods.html"
_LONGEST, _MOST_SHEETS = 60, 200


@router.get("/lots")
def home(visit: AtDesk, state: str = "", titrant: str = "") -> Response:
    """Show all lots, due soonest first."""
    return show(
        visit,
        "lots/home.html",
        lambda session, **who: open_lots(session, state=state, titrant=titrant, **who),
    )


@router.get("/lots/new")
def make_up_page(visit: AtDesk) -> Response:
    """Show the form for a new lot."""
    return show(visit, "lots/new.html", open_make_up)


@router.post("/lots/new")
def make_up(post: Posted) -> Response:
    """Keep a lot that was made up."""

    def work() -> str:
        return f"/lots/{post.act(make_up_lot, read_make_up(post.form))}"

    return post.answer(work, again=Again("lots/new.html", open_make_up))


@router.get("/lots/{code}")
def lot(visit: AtDesk, code: str, since: str | None = None) -> Response:
    """Show one lot: preparation, bottles, sheets, certificates, and who used it since a day."""
    return show(
        visit,
        "lots/lot.html",
        lambda session, **who: open_lot(session, code, since=since, **who),
    )


def methods_asked(request: Request) -> MethodsAsked:
    """Return which sheets of a lot to compare, and the value to be true to, from the address."""
    query = request.query_params
    return MethodsAsked(
        sheets=tuple(one[:_LONGEST] for one in query.getlist("sheet")[:_MOST_SHEETS] if one),
        reference=query.get("reference", "")[:_LONGEST],
        reference_U=query.get("reference_U", "")[:_LONGEST],
    )


ToCompare = Annotated[MethodsAsked, Depends(methods_asked)]


@router.get("/lots/{code}/methods")
def methods(visit: AtDesk, code: str, asked: ToCompare) -> Response:
    """Show the end-point methods of a lot side by side."""
    try:
        return show(visit, _METHODS, open_methods, code, asked)
    except Unacceptable as refusal:
        plain = MethodsAsked(sheets=asked.sheets)
        typed = {"reference": asked.reference, "reference_U": asked.reference_U}
        shown: dict[str, Any] = {"status": 422, "problem": problem_of(refusal), "typed": typed}
        return show(visit, _METHODS, open_methods, code, plain, **shown)


@router.get("/lots/{code}/export.zip")
def export(visit: AtDesk, code: str) -> Response:
    """Hand out all of a lot in one archive."""
    return hand_out_lot(visit, code)


@router.post("/lots/{code}/bottles")
def fill(post: Posted, code: str) -> Response:
    """Fill bottles from a lot."""

    def work() -> str:
        post.act(fill_bottles, read_fill(post.form, code))
        return f"/lots/{code}"

    return post.answer(work, again=Again("lots/lot.html", open_lot, (code,)))


@router.post("/lots/{code}/propose-pull")
def propose(post: Posted, code: str) -> Response:
    """Propose to take a lot out of use for good."""

    def work() -> str:
        post.act(propose_pull, ProposePull(code, post.form.text("reason")))
        return f"/lots/{code}"

    return post.answer(work)


@router.post("/lots/{code}/confirm-pull")
def confirm(post: Posted, code: str) -> Response:
    """Take a lot out of use for good, as somebody else proposed."""

    def work() -> str:
        post.act(confirm_pull, ConfirmPull(code))
        return f"/lots/{code}"

    return post.answer(work)
