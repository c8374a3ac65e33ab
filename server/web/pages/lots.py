"""Titrant lots: made up, filled into bottles, pulled."""

from fastapi import APIRouter, Response

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
from server.web.forms.lots import read_fill, read_make_up
from server.web.forms.posts import Again, Posted
from server.web.showing import show
from server.web.visits import AtDesk

router = APIRouter()


@router.get("/lots")
def home(visit: AtDesk, state: str = "") -> Response:
    """Show all lots, made up last first."""
    return show(
        visit,
        "lots/home.html",
        lambda session, **who: open_lots(session, state=state, **who),
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
def lot(visit: AtDesk, code: str) -> Response:
    """Show one lot: preparation, bottles, sheets, certificates."""
    return show(visit, "lots/lot.html", open_lot, code)


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
