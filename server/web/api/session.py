"""Sessions of scripts."""

from dataclasses import dataclass, field
from typing import Annotated

from fastapi import APIRouter, Depends, Response

from server.lab.actor import Actor
from server.procedures.sign_in import sign_out
from server.web.api.desk import AtApi, answer
from server.web.bodies import Given, body_of
from server.web.proving import sign_in
from server.web.signing import renew_password
from server.web.visits import AtDesk, drop_cookie, set_cookie

router = APIRouter(tags=["session"])


@dataclass(frozen=True, slots=True)
class Credentials:
    """A sign-in name and its password."""

    name: str
    password: str = field(repr=False)


@dataclass(frozen=True, slots=True)
class Renewal:
    """One's present and new password."""

    old: str = field(repr=False)
    new: str = field(repr=False)


_SIGN_IN, _RENEW = body_of(Credentials), body_of(Renewal)


@router.post("/session", openapi_extra=_SIGN_IN.openapi, status_code=201)
def begin(visit: AtDesk, given: Annotated[Given, Depends(_SIGN_IN)]) -> Response:
    """Sign in; the answer sets the session's cookie and tells the token that writes carry."""
    signed = sign_in(visit, given["name"], given["password"])
    response = answer(_told(signed.actor, signed.form_token), status=201)
    set_cookie(response, visit, signed.token)
    return response


@router.get("/session")
def who(visit: AtDesk) -> Response:
    """Tell who is signed in, and the token that writes carry in ``X-Form-Token``."""
    return answer(_told(visit.person, visit.form_token))


@router.delete("/session", status_code=204)
def end(desk: AtApi) -> Response:
    """Sign out."""
    visit = desk.visit
    token = visit.token or ""
    visit.parts.transactions.write(
        lambda session: sign_out(session, token, now=visit.parts.clock())
    )
    response = Response(status_code=204)
    drop_cookie(response, visit)
    return response


@router.post("/session/password", openapi_extra=_RENEW.openapi)
def renew(desk: AtApi, given: Annotated[Given, Depends(_RENEW)]) -> Response:
    """Change one's own password; all sessions end, and this one begins anew."""
    signed = renew_password(desk.visit, given["old"], given["new"])
    response = answer(_told(signed.actor, signed.form_token))
    set_cookie(response, desk.visit, signed.token)
    return response


def _told(actor: Actor, form_token: str) -> dict[str, object]:
    return {
        "person": {
            "id": actor.person_id,
            "printed_name": actor.printed_name,
            "initials": actor.initials,
            "roles": sorted(actor.roles),
        },
        "form_token": form_token,
    }
