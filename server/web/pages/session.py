"""Signing in and out, the first day, one's own page."""

import secrets
from urllib.parse import urlsplit

from fastapi import APIRouter, Response

from server.lab.refusal import NotAllowed, Refusal, Unacceptable
from server.procedures.laboratory import SetUpLaboratory, set_up_laboratory
from server.procedures.people import hash_new_password
from server.procedures.sign_in import sign_out
from server.records.queries.loading import there_is_a_laboratory
from server.sheets.own_page import open_own_page
from server.web.errors import answer_of, headers_of
from server.web.forms.posts import Again, Posted, see_other
from server.web.proving import sign_in
from server.web.showing import SignInPage, page_opener, problem_of, show
from server.web.signing import renew_password
from server.web.visits import AtDesk, Visit, drop_cookie, set_cookie

router = APIRouter()
_SIGN_IN, _SET_UP = "session/sign_in.html", "session/setup.html"


def is_set_up(visit: Visit) -> bool:
    """Say whether the laboratory is set up."""
    return visit.parts.transactions.read(there_is_a_laboratory)


def safe_next(path: str) -> str:
    """Return where to go after signing in: a path of this server, the shelf where it is none."""
    parts = urlsplit(path)
    is_path = (
        path.startswith("/") and not path.startswith("//") and not (parts.scheme or parts.netloc)
    )
    return path if is_path and path.isprintable() and "\\" not in path else "/"


@router.get("/sign-in")
def sign_in_page(visit: AtDesk, next: str = "/") -> Response:  # noqa: A002 - the address says next
    """Show the sign-in page."""
    if not is_set_up(visit):
        return see_other("/setup")
    return show(visit, _SIGN_IN, page_opener(SignInPage(safe_next(next))))


@router.post("/sign-in")
def sign_in_here(post: Posted) -> Response:
    """Begin a session and lead back to where one was."""
    visit, form = post.visit, post.form
    to = safe_next(form.text("next", "/"))
    try:
        post.need_token()
        signed = sign_in(visit, form.text("name"), form.text("password"))
    except Refusal as refusal:
        return show(
            visit,
            _SIGN_IN,
            page_opener(SignInPage(to)),
            status=answer_of(refusal).status,
            headers=headers_of(refusal),
            problem=problem_of(refusal),
            typed=form.shown(),
        )
    response = see_other(to)
    set_cookie(response, visit, signed.token)
    return response


@router.post("/sign-out")
def sign_out_here(post: Posted) -> Response:
    """End the session; a browser that has none is led on all the same."""
    visit = post.visit
    token = visit.token
    if token is not None:
        post.need_token()
        visit.parts.transactions.write(
            lambda session: sign_out(session, token, now=visit.parts.clock())
        )
    response = see_other("/")
    drop_cookie(response, visit)
    return response


@router.get("/setup")
def set_up_page(visit: AtDesk) -> Response:
    """Show the page of the first day."""
    if is_set_up(visit):
        return see_other("/sign-in")
    return show(visit, _SET_UP, page_opener())


@router.post("/setup")
def set_up(post: Posted) -> Response:
    """Set up the laboratory with its first steward."""
    visit, form = post.visit, post.form
    command = SetUpLaboratory(
        name=form.text("laboratory"),
        address=form.text("address"),
        zone=form.text("zone").strip(),
        sign_in_name=form.text("sign_in_name"),
        printed_name=form.text("printed_name"),
        password=form.text("password"),
    )
    try:
        post.need_token()
        _need_code(visit, form.text("setup_code"))
        hashed = hash_new_password(command.password, names=(command.printed_name,))
        visit.parts.transactions.write(
            lambda session: set_up_laboratory(
                session, command, password_hash=hashed, now=visit.parts.clock()
            )
        )
    except Refusal as refusal:
        if is_set_up(visit):
            raise
        field = "laboratory" if refusal.field == "name" else refusal.field
        return show(
            visit,
            _SET_UP,
            page_opener(),
            status=answer_of(refusal).status,
            headers=headers_of(refusal),
            problem=problem_of(refusal, field),
            typed=form.shown(),
        )
    return see_other("/sign-in")


def _need_code(visit: Visit, code: str) -> None:
    if is_set_up(visit):
        raise NotAllowed("This laboratory is set up already; a steward adds people.")
    given = code.strip().encode()
    if not secrets.compare_digest(given, visit.parts.setup_code.encode()):
        says = "This is not the set-up code; it was printed where the program was started."
        raise NotAllowed(says, field="setup_code")


@router.get("/me")
def me(visit: AtDesk) -> Response:
    """Show one's own page."""
    visit.person  # noqa: B018 - refuses who is not signed in
    return show(visit, "session/me.html", open_own_page)


@router.post("/me")
def change_own_password(post: Posted) -> Response:
    """Change one's own password; other sessions end."""
    tokens: list[str] = []

    def work() -> str:
        if not post.form.text("new"):
            raise Unacceptable("Give the new password.", field="new")
        tokens.append(
            renew_password(post.visit, post.form.text("old"), post.form.text("new")).token
        )
        return "/me"

    response = post.answer(work, again=Again("session/me.html", open_own_page))
    for token in tokens:
        set_cookie(response, post.visit, token)
    return response
