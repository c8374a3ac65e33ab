"""A bottle opened, moved, and what it was used for."""

from fastapi import APIRouter, Response

from server.procedures.bottles import MoveBottle, OpenBottle, move_bottle, open_bottle
from server.procedures.uses import StrikeUse, UseBottle, strike_use, use_bottle
from server.reports.uses import uses_csv
from server.sheets.bottle_card import open_bottle_card
from server.sheets.uses_page import open_uses_of_lot
from server.web.forms.posts import Again, Posted
from server.web.pages.files import attachment
from server.web.visits import AtDesk

router = APIRouter()


@router.post("/b/{code}/opened")
def opened(post: Posted, code: str) -> Response:
    """Write down that a bottle was opened."""

    def work() -> str:
        post.act(open_bottle, OpenBottle(code))
        return f"/b/{code}"

    return post.answer(work)


@router.post("/b/{code}/moved")
def moved(post: Posted, code: str) -> Response:
    """Write down where a bottle stands now."""

    def work() -> str:
        post.act(move_bottle, MoveBottle(code, post.form.text("place")))
        return f"/b/{code}"

    return post.answer(work, again=_again(code))


@router.post("/b/{code}/uses")
def use(post: Posted, code: str) -> Response:
    """Write down a result that rests on a bottle."""

    def work() -> str:
        form = post.form
        command = UseBottle(
            code,
            result_id=form.text("result_id"),
            certificate=form.text("certificate"),
            used_at=form.text("used_at"),
            says=form.text("says"),
        )
        post.act(use_bottle, command)
        return f"/b/{code}#uses"

    return post.answer(work, again=_again(code))


@router.post("/b/{code}/uses/{use_id}/strike")
def strike(post: Posted, code: str, use_id: str) -> Response:
    """Strike a use through that was written by mistake; it stays readable."""

    def work() -> str:
        post.act(strike_use, StrikeUse(code, use_id, post.form.text("reason")))
        return f"/b/{code}#uses"

    return post.answer(work)


@router.get("/lots/{code}/uses.csv")
def lot_uses_csv(visit: AtDesk, code: str, since: str = "") -> Response:
    """Send what the bottles of a lot were used for as a CSV file."""
    view = visit.read(open_uses_of_lot, code, since=since, whole=True)
    return attachment(uses_csv(view), f"uses {code}.csv", "text/csv; charset=utf-8")


def _again(code: str) -> Again:
    def opened(session: object, **who: object) -> object:
        return open_bottle_card(session, code, at=None, **who)  # type: ignore[arg-type]

    return Again("shelf/bottle.html", opened)
