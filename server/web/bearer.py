"""Tokens of scripts at the door: each opens what its scopes name, and nothing else."""

import re
from collections.abc import Mapping
from datetime import datetime
from types import MappingProxyType
from typing import Any

from starlette.requests import Request

from server.lab.refusal import NotAllowed
from server.lab.scopes import Scope
from server.procedures.access_tokens import TokenView, find_token
from server.web.refusals import TokenRefused

_SCHEME = "bearer "
_MOST_TOKEN = 200

#: What a token may open, route by route, and the scope that it needs. All else is closed to it,
#: also what a visitor may open: a token is never a sign-in.
ROUTES: Mapping[str, Scope] = MappingProxyType(
    {
        "GET /api/bottles/{code}": Scope.LOOK_UP,
        "GET /api/shelf": Scope.LOOK_UP,
        "POST /api/bottles/{code}/uses": Scope.USES,
        "GET /api/bottles/{code}/uses": Scope.EXPORT,
        "GET /api/lots/{code}/uses": Scope.EXPORT,
        "GET /lots/{code}/uses.csv": Scope.EXPORT,
        "GET /api/certificates/{number}": Scope.EXPORT,
        "GET /api/certificates/{number}.pdf": Scope.EXPORT,
        "GET /api/certificates/{number}.json": Scope.EXPORT,
        "GET /api/certificates/{number}.jws": Scope.EXPORT,
        "GET /api/certificates/{number}.dcc.xml": Scope.EXPORT,
        "GET /api/certificates/{number}.bench-record.json": Scope.EXPORT,
        "GET /shelf/list.csv": Scope.EXPORT,
        "GET /lots/list.csv": Scope.EXPORT,
        "GET /stores/standard-lots/list.csv": Scope.EXPORT,
        "GET /instruments/list.csv": Scope.EXPORT,
        "GET /trail/list.csv": Scope.EXPORT,
        "GET /trail/list.jsonl": Scope.EXPORT,
    }
)


def carries_token(request: Request) -> bool:
    """Say whether a request comes with a token instead of a session."""
    return request.headers.get("authorization", "").lower().startswith(_SCHEME)


def find_bearer(session: Any, request: Request, *, now: datetime) -> TokenView:
    """Return the token of a request, which holds and may open this route.

    Raises:
        TokenRefused: it is unknown, revoked or past its day.
        NotAllowed: it does not open this.
    """
    token = request.headers["authorization"][len(_SCHEME) :].strip()
    view = find_token(session, token, now=now) if 0 < len(token) <= _MOST_TOKEN else None
    if view is None:
        says = "This token does not hold: it is unknown, revoked, or past its last day."
        raise TokenRefused(says, field="Authorization", example="Authorization: Bearer tl_...")
    scope = _scope_of(request)
    if scope is None:
        says = "No token opens this; sign in. A token reads bottles and lists, and records uses."
        raise NotAllowed(says)
    if scope not in view.scopes:
        says = f"This token may not do this: its owner did not tick “{scope.value}”."
        raise NotAllowed(says)
    return view


def _scope_of(request: Request) -> Scope | None:
    """Return the scope that opens what was asked for, as the router matched it; None for none."""
    asked = f"{request.method} {request.scope['path']}"
    matched = str(getattr(request.scope.get("route"), "path", "?"))
    for pattern, scope in ROUTES.items():
        # the router tells the route's own pattern, without the beginning of its addresses
        if pattern.endswith(matched) and _PATTERNS[pattern].fullmatch(asked):
            return scope
    return None


_PATTERNS: Mapping[str, re.Pattern[str]] = MappingProxyType(
    {pattern: re.compile(re.sub(r"\\{\w+\\}", "[^/]+", re.escape(pattern))) for pattern in ROUTES}
)
