"""The bench: beginning, writing, handing in."""

from fastapi import APIRouter, Response

from server.procedures.bench import (
    AbandonSheet,
    LetBeUsed,
    abandon_sheet,
    begin_sheet,
    let_be_used,
)
from server.sheets.bench_home import open_begin, open_bench_home
from server.sheets.bench_sheet import open_bench_sheet
from server.sheets.hand_in import evaluate_hand_in, read_hand_in
from server.web.forms.bench import read_begin, read_signer, read_signing
from server.web.forms.posts import Again, Posted
from server.web.proving import asks_name
from server.web.showing import show
from server.web.signing import hand_in
from server.web.templating import script_json
from server.web.visits import AtDesk

router = APIRouter()


@router.get("/bench")
def home(visit: AtDesk) -> Response:
    """Show open sheets and what can be standardized."""
    return show(visit, "bench/home.html", open_bench_home)


@router.get("/bench/begin")
def begin_page(visit: AtDesk, lot: str = "", recipe: str = "") -> Response:
    """Show what a new sheet would rest on."""
    return show(
        visit,
        "bench/begin.html",
        lambda session, **who: open_begin(session, lot, recipe_id=recipe or None, **who),
    )


@router.post("/bench")
def begin(post: Posted) -> Response:
    """Begin a bench sheet."""
    command = read_begin(post.form)
    again = Again(
        "bench/begin.html",
        lambda session, **who: open_begin(
            session, command.lot_code, recipe_id=command.recipe_id or None, **who
        ),
    )
    return post.answer(lambda: f"/bench/{post.act(begin_sheet, command)}", again=again)


@router.get("/bench/{sheet_id}")
def sheet(visit: AtDesk, sheet_id: str) -> Response:
    """Show a bench sheet; its script draws it from the sheet's JSON."""
    return show(
        visit,
        "bench/sheet.html",
        open_bench_sheet,
        sheet_id,
        with_page=lambda page: {"sheet_json": script_json(page)},
    )


@router.get("/bench/{sheet_id}/hand-in")
def hand_in_page(visit: AtDesk, sheet_id: str) -> Response:
    """Show everything on one page before the signature."""
    return show(
        visit,
        "bench/hand_in.html",
        read_hand_in,
        sheet_id,
        finish=evaluate_hand_in,
        asks_name=asks_name(visit),
    )


@router.post("/bench/{sheet_id}/hand-in")
def sign_and_hand_in(post: Posted, sheet_id: str) -> Response:
    """Sign a sheet as *measured* and hand it in."""

    def work() -> str:
        command = read_signing(post.form, sheet_id)
        hand_in(post.visit, command, read_signer(post.form), key=post.key)
        return f"/bench/{sheet_id}"

    again = Again(
        "bench/hand_in.html",
        read_hand_in,
        (sheet_id,),
        finish=evaluate_hand_in,
        more={"asks_name": asks_name(post.visit)},
    )
    return post.answer(work, again=again)


@router.post("/bench/{sheet_id}/abandon")
def abandon(post: Posted, sheet_id: str) -> Response:
    """Abandon a sheet; it stays readable."""

    def work() -> str:
        post.act(abandon_sheet, AbandonSheet(sheet_id, post.form.text("reason")))
        return "/bench"

    return post.answer(work)


@router.post("/bench/{sheet_id}/let-be-used")
def let(post: Posted, sheet_id: str) -> Response:
    """Let something of a sheet be used out of date, as its keeper."""

    def work() -> str:
        command = LetBeUsed(sheet_id, post.form.text("what"), post.form.text("reason"))
        post.act(let_be_used, command)
        return f"/bench/{sheet_id}"

    return post.answer(work)
