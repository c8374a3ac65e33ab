"""The one table from refusals to HTTP: pages for people, problem+json for scripts."""

import logging
import re
import secrets
from collections.abc import Mapping
from dataclasses import dataclass
from http import HTTPStatus
from types import MappingProxyType
from typing import Any

from fastapi import FastAPI, Request, Response
from fastapi.exceptions import RequestValidationError
from fastapi.responses import JSONResponse
from starlette.exceptions import HTTPException

from server.lab.refusal import (
    CannotWrite,
    KeyMissing,
    NotAllowed,
    NotFound,
    NotSignedIn,
    Refusal,
    SavedFirst,
    Stale,
    TooOften,
    Unacceptable,
)
from server.web.bearer import carries_token
from server.web.refusals import NotFromHere, TokenRefused, TooLarge, Unreadable, WrongKind
from server.web.showing import show_problem, show_sign_in

_LOG = logging.getLogger(__name__)


@dataclass(frozen=True, slots=True)
class Answer:
    """How a refusal is answered: the status and a title that never changes."""

    status: int
    title: str


#: The most special class that a refusal belongs to decides.
STATUS: Mapping[type[Refusal], Answer] = MappingProxyType(
    {
        NotSignedIn: Answer(401, "Not signed in"),
        TokenRefused: Answer(401, "Token does not hold"),
        NotAllowed: Answer(403, "Not allowed"),
        NotFromHere: Answer(403, "Not sent from here"),
        NotFound: Answer(404, "Not found"),
        SavedFirst: Answer(409, "Somebody saved first"),
        Stale: Answer(412, "Changed since it was read"),
        TooLarge: Answer(413, "Too large"),
        WrongKind: Answer(415, "Of another kind"),
        Unacceptable: Answer(422, "Cannot be taken"),
        KeyMissing: Answer(400, "Key missing"),
        Unreadable: Answer(400, "Cannot be read"),
        TooOften: Answer(429, "Too often"),
        CannotWrite: Answer(503, "Not saved"),
        Refusal: Answer(422, "Cannot be taken"),
    }
)
_INTERNAL = Answer(500, "Something went wrong here")


def answer_of(refusal: Refusal) -> Answer:
    """Return the status and title of a refusal."""
    return next(STATUS[one] for one in type(refusal).__mro__ if one in STATUS)


def headers_of(refusal: Refusal) -> dict[str, str]:
    """Return the headers that a refusal's status asks for."""
    if isinstance(refusal, TooOften):
        return {"Retry-After": str(max(1, round(refusal.shown.get("retry_after_s", 1))))}
    if isinstance(refusal, TokenRefused):
        return {"WWW-Authenticate": 'Bearer realm="Titrant Ledger", error="invalid_token"'}
    if isinstance(refusal, NotSignedIn):
        return {"WWW-Authenticate": 'Cookie realm="Titrant Ledger"'}
    return {}


def problem_json(
    answer: Answer,
    detail: str,
    *,
    more: Mapping[str, Any] | None = None,
    headers: Mapping[str, str] | None = None,
) -> Response:
    """Return a problem document (RFC 9457); keys of ``more`` that hold nothing are left out."""
    word = re.sub(r"[^a-z]+", "-", answer.title.lower())
    body = {
        "type": f"/about#{word}",
        "title": answer.title,
        "status": answer.status,
        "detail": detail,
        **{name: value for name, value in (more or {}).items() if value},
    }
    return JSONResponse(body, answer.status, headers=headers, media_type="application/problem+json")


def is_for_scripts(request: Request) -> bool:
    """Say whether a request is answered with JSON."""
    path = request.url.path
    return carries_token(request) or path == "/api" or path.startswith("/api/") or path == "/health"


def refuse(request: Request, refusal: Refusal) -> Response:
    """Answer a refusal in the way its reader understands."""
    answer, headers = answer_of(refusal), headers_of(refusal)
    if is_for_scripts(request):
        more = {"field": refusal.field, "example": refusal.example, "shown": refusal.shown}
        return problem_json(answer, refusal.says, more=more, headers=headers)
    if isinstance(refusal, NotSignedIn):
        return show_sign_in(request, refusal, status=answer.status, headers=headers)
    nearest = refusal.shown.get("nearest", ())
    says = refusal.says
    if refusal.example and not nearest:
        says = f"{says} For example: {refusal.example}."
    return show_problem(request, says, status=answer.status, headers=headers, nearest=nearest)


def answer_incident(request: Request, problem: BaseException) -> Response:
    """Log what nobody foresaw under a number, and answer with that number alone."""
    incident = secrets.token_hex(6)
    _LOG.error("Incident %s: %s %s", incident, request.method, request.url.path, exc_info=problem)
    says = "Something went wrong here. Nothing of this request was saved in part."
    if is_for_scripts(request):
        return problem_json(_INTERNAL, says, more={"incident": incident})
    return show_problem(request, says, status=_INTERNAL.status, incident=incident)


def add_error_handlers(app: FastAPI) -> None:
    """Let refusals, and what the framework refuses by itself, meet the table."""

    @app.exception_handler(Refusal)
    def _refusal(request: Request, refusal: Refusal) -> Response:
        return refuse(request, refusal)

    @app.exception_handler(RequestValidationError)
    def _odd_query(request: Request, problem: RequestValidationError) -> Response:
        first = problem.errors()[0]
        field = ".".join(str(part) for part in first["loc"][1:])
        return refuse(request, Unacceptable(f"{field}: {first['msg']}.", field=field))

    @app.exception_handler(HTTPException)
    def _http(request: Request, problem: HTTPException) -> Response:
        answer = Answer(problem.status_code, HTTPStatus(problem.status_code).phrase)
        says = {
            404: "There is no such page.",
            405: "This address does not take that kind of request.",
        }.get(problem.status_code, f"{answer.title}.")
        if is_for_scripts(request):
            return problem_json(answer, says, headers=problem.headers)
        return show_problem(request, says, status=answer.status, headers=problem.headers)
