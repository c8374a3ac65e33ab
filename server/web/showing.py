"""Showing pages: the read model, what stands around it, and what a form held when refused."""

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from fastapi import Request
from fastapi.responses import HTMLResponse, Response
from starlette.routing import Match

from server.lab.refusal import Refusal
from server.sheets.people import Chrome, open_chrome
from server.web.parts import parts_of
from server.web.templating import new_key
from server.web.visits import Visit, open_visit, set_cookie

_NOBODY = Chrome(laboratory="", printed_name=None, initials=None, roles=(), waiting=0)


@dataclass(frozen=True, slots=True)
class FormProblem:
    """What is wrong with a form: the sentence, the field, an example, what somebody else saved."""

    says: str
    field: str | None
    example: str | None
    standing: tuple[tuple[str, str], ...] = ()


@dataclass(frozen=True, slots=True)
class ProblemPage:
    """What the problem page says; ``typed`` is what the refused form held.

    ``nearest`` are codes close to one that nothing has, each with its address.
    """

    status: int
    says: str
    incident: str | None
    typed: tuple[tuple[str, str], ...]
    nearest: tuple[tuple[str, str], ...] = ()


@dataclass(frozen=True, slots=True)
class SignInPage:
    """Where to go after signing in, and what a form held that came from nobody."""

    next: str
    typed: tuple[tuple[str, str], ...] = ()


def page_opener(page: Any = None) -> Callable[..., Any]:
    """Return an opener for a page that reads nothing."""

    def opened(session: Any, **who: Any) -> Any:
        del session, who
        return page

    return opened


def show(
    visit: Visit,
    template: str,
    open_page: Callable[..., Any],
    *given: Any,
    finish: Callable[[Any], Any] | None = None,
    with_page: Callable[[Any], Mapping[str, Any]] | None = None,
    **context: Any,
) -> Response:
    """Open a page in one transaction and draw it.

    ``finish`` makes the page of what was read, with nothing open: long arithmetic waits for it.
    ``with_page`` adds to the context from the page.
    """

    def work(session: Any) -> tuple[Any, Chrome]:
        who: dict[str, Any] = {"actor": visit.actor, "now": visit.now}
        return open_page(session, *given, **who), open_chrome(session, **who)

    page, chrome = visit.parts.transactions.read(work)
    page = finish(page) if finish else page
    more = with_page(page) if with_page else {}
    return draw(visit, template, page, chrome, **{**more, **context})


def draw(
    visit: Visit,
    template: str,
    page: Any,
    chrome: Chrome,
    *,
    status: int = 200,
    headers: Mapping[str, str] | None = None,
    problem: FormProblem | None = None,
    typed: Mapping[str, Any] | None = None,
    **more: Any,
) -> Response:
    """Draw a page that was opened."""
    context = {
        "page": page,
        "chrome": chrome,
        "path": visit.path,
        "form_token": visit.form_token,
        "key": new_key(),
        "problem": problem,
        "typed": typed or {},
        **more,
    }
    html = visit.parts.templating.draw(template, context)
    response = HTMLResponse(html, status, headers=dict(headers or {}))
    if visit.is_new and visit.visitor_token and template.startswith("session/"):
        set_cookie(response, visit, visit.visitor_token, visitor=True)
    return response


def problem_of(refusal: Refusal, field: str | None = None) -> FormProblem:
    """Return what a form shows of a refusal, with what somebody else saved where that is it."""
    standing = refusal.shown.get("standing")
    lines = tuple(_lines(standing)) if isinstance(standing, Mapping) else ()
    return FormProblem(refusal.says, field or refusal.field, refusal.example, lines)


def _lines(standing: Mapping[str, Any]) -> list[tuple[str, str]]:
    found: list[tuple[str, str]] = []
    for name, value in standing.items():
        if isinstance(value, Mapping):
            found += _lines(value)
        elif isinstance(value, list | tuple):
            found.append((name, ", ".join(str(one) for one in value)))
        elif value is not None:
            found.append((name, str(value)))
    return found


def show_sign_in(
    request: Request, refusal: Refusal, *, status: int, headers: Mapping[str, str]
) -> Response:
    """Answer somebody who is not signed in with the sign-in page, which leads back here."""
    visit = open_visit(request)
    page = SignInPage(next=_page_before(request), typed=typed_lines(request))
    return show(
        visit,
        "session/sign_in.html",
        page_opener(page),
        status=status,
        headers=headers,
        problem=problem_of(refusal) if request.method != "GET" else None,
    )


def _page_before(request: Request) -> str:
    """Return the page that somebody was on: this one, or the one whose form was sent."""
    path = request.url.path
    if request.method == "GET":
        return path + (f"?{request.url.query}" if request.url.query else "")
    return next((one for one in (path, path.rpartition("/")[0]) if _is_page(request, one)), "/")


def _is_page(request: Request, path: str) -> bool:
    scope = {**request.scope, "method": "GET", "path": path}
    return any(route.matches(scope)[0] is Match.FULL for route in request.app.routes)


def show_problem(
    request: Request,
    says: str,
    *,
    status: int,
    headers: Mapping[str, str] | None = None,
    incident: str | None = None,
    nearest: Sequence[str] = (),
) -> Response:
    """Answer with the problem page; it is drawn without the database where that is the trouble."""
    place = "/lots/" if request.url.path.startswith("/lots") else "/b/"
    close = tuple((code, place + code) for code in nearest)
    page = ProblemPage(status, says, incident, typed_lines(request), close)
    visit: Visit | None = getattr(request.state, "visit", None)
    context: dict[str, Any] = {"status": status, "headers": headers}
    if incident is None:
        visit = visit or open_visit(request)
        return show(visit, "problem.html", page_opener(page), **context)
    visit = visit or _bare_visit(request)
    return draw(visit, "problem.html", page, _NOBODY, **context)


def typed_lines(request: Request) -> tuple[tuple[str, str], ...]:
    """Return what the refused form held, to be copied."""
    lines: tuple[tuple[str, str], ...] = getattr(request.state, "typed_lines", ())
    return lines


def _bare_visit(request: Request) -> Visit:
    parts = parts_of(request)
    return Visit(
        parts=parts,
        path=request.url.path,
        source="",
        secure=True,
        now=parts.clock(),
        token=None,
        actor=None,
        form_token="",
    )
