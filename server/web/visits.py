"""Who asks: the session behind a request's cookie, and the token that its forms carry."""

import logging
from collections.abc import Callable
from dataclasses import dataclass, field
from datetime import datetime
from typing import Annotated, Any, TypeVar

from fastapi import Depends, Request, Response

from server.credentials.tokens import new_token, same_token, token_digest
from server.lab.actor import Actor
from server.lab.refusal import CannotWrite, NotSignedIn
from server.procedures.access_tokens import TokenView, record_token_seen
from server.procedures.sign_in import find_actor, record_seen
from server.web.bearer import carries_token, find_bearer
from server.web.parts import Parts, parts_of

T = TypeVar("T")

_LOG = logging.getLogger(__name__)
_MOST_TOKEN = 200


@dataclass(frozen=True, slots=True)
class Visit:
    """One request: who it is, from where, when.

    ``form_token`` is what this visit's forms carry. ``visitor_token`` is the secret behind it where
    nobody is signed in; ``is_new`` says that the browser does not have it yet. ``bearer`` is the
    token by which a script comes: it has no session, and no form is its.
    """

    parts: Parts
    path: str
    source: str
    secure: bool
    now: datetime
    token: str | None = field(repr=False)
    actor: Actor | None
    form_token: str = field(repr=False)
    visitor_token: str | None = field(repr=False, default=None)
    is_new: bool = False
    bearer: TokenView | None = None

    @property
    def person(self) -> Actor:
        """Who is signed in.

        Raises:
            NotSignedIn: nobody is.
        """
        if self.actor is None:
            raise NotSignedIn("Sign in first.")
        return self.actor

    def read(self, open_sheet: Callable[..., T], *given: Any, **more: Any) -> T:
        """Open a sheet for who is here, in a transaction of its own."""
        return self.parts.transactions.read(
            lambda session: open_sheet(session, *given, actor=self.actor, now=self.now, **more)
        )

    def holds_token(self, token: str) -> bool:
        """Say whether a form or request carries this visit's token."""
        return bool(token) and same_token(token, self.form_token)


def cookie_name(*, secure: bool, visitor: bool = False) -> str:
    """Return a cookie's name: bound to this host where the traffic is https.

    Browsers keep no ``__Host-`` cookie from plain http, so that plain http has a name of its own;
    over https the plain name is never read.
    """
    name = "titrant-ledger-visitor" if visitor else "titrant-ledger"
    return f"__Host-{name}" if secure else name


def is_secure(request: Request) -> bool:
    """Say whether the browser reached this server by https."""
    return parts_of(request).secure or request.url.scheme == "https"


def set_cookie(response: Response, visit: Visit, value: str, *, visitor: bool = False) -> None:
    """Give the browser a cookie that ends with it; the server ends sessions by itself."""
    response.set_cookie(
        cookie_name(secure=visit.secure, visitor=visitor),
        value,
        path="/",
        secure=visit.secure,
        httponly=True,
        samesite="lax",
    )


def drop_cookie(response: Response, visit: Visit) -> None:
    """Take the session's cookie back."""
    response.delete_cookie(
        cookie_name(secure=visit.secure),
        path="/",
        secure=visit.secure,
        httponly=True,
        samesite="lax",
    )


def source_of(request: Request) -> str:
    """Return where a request comes from, for counting failures."""
    return request.client.host if request.client else "unknown"


def visit_in(session: Any, request: Request, *, now: datetime) -> tuple[Visit, bool]:
    """Return the visit behind a request, and whether its session should be noted as seen.

    Raises:
        TokenRefused: it carries a token for scripts that does not hold.
        NotAllowed: its token does not open this.
    """
    secure = is_secure(request)
    common: dict[str, Any] = {
        "parts": parts_of(request),
        "path": request.url.path,
        "source": source_of(request),
        "secure": secure,
        "now": now,
    }
    if carries_token(request):
        bearer = find_bearer(session, request, now=now)
        script = Visit(**common, token=None, actor=bearer.actor, form_token="", bearer=bearer)
        return script, bearer.to_touch
    token = request.cookies.get(cookie_name(secure=secure), "")[:_MOST_TOKEN]
    view = find_actor(session, token, now=now) if token else None
    if view is not None:
        known = Visit(**common, token=token, actor=view.actor, form_token=view.form_token)
        return known, view.to_touch
    kept = request.cookies.get(cookie_name(secure=secure, visitor=True), "")[:_MOST_TOKEN]
    visitor = kept or new_token()
    unknown = Visit(
        **common,
        token=None,
        actor=None,
        form_token=token_digest(visitor),
        visitor_token=visitor,
        is_new=not kept,
    )
    return unknown, False


def open_visit(request: Request) -> Visit:
    """Return the visit behind a request; once a minute its session is noted as seen."""
    parts = parts_of(request)
    now = parts.clock()
    visit, to_touch = parts.transactions.read(lambda session: visit_in(session, request, now=now))
    if to_touch:
        touch(visit)
    request.state.visit = visit
    return visit


def touch(visit: Visit) -> None:
    """Note that a session or token is in use; a database that is full does not stop reading."""
    token, bearer, now = visit.token or "", visit.bearer, visit.now

    def work(session: Any) -> None:
        if bearer is not None:
            record_token_seen(session, bearer.token_id, now=now)
        else:
            record_seen(session, token, now=now)

    try:
        visit.parts.transactions.write(work)
    except CannotWrite:
        _LOG.warning("A session in use could not be noted as seen.")


AtDesk = Annotated[Visit, Depends(open_visit)]
