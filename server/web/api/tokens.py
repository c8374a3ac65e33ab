"""One's own tokens for scripts over the API."""

from typing import Annotated, Any

from fastapi import APIRouter, Depends, Response

from server.procedures.access_tokens import MakeToken, RevokeToken, revoke_token
from server.sheets.own_page import open_own_page
from server.web.api.desk import AtApi, answer
from server.web.bodies import Given, body_of
from server.web.token_making import new_token_for
from server.web.visits import AtDesk

router = APIRouter(tags=["tokens"])
_PASSWORD: dict[str, Any] = {"password": str}
_MAKE = body_of(MakeToken, **_PASSWORD)


@router.get("/tokens")
def tokens(visit: AtDesk) -> Response:
    """List one's own tokens; the tokens themselves are kept nowhere."""
    return answer(visit.read(open_own_page))


@router.post("/tokens", openapi_extra=_MAKE.openapi, status_code=201)
def make(desk: AtApi, given: Annotated[Given, Depends(_MAKE)]) -> Response:
    """Make a token; this answer is the only one that ever shows it."""
    password = given.pop("password")
    made = new_token_for(desk.visit, MakeToken(**given), password, key=desk.key)
    return answer({"id": made.id, "token": made.token}, status=201)


@router.post("/tokens/{token_id}/revoke")
def revoke(desk: AtApi, token_id: str) -> Response:
    """End one of one's own tokens for good."""
    desk.act(revoke_token, RevokeToken(token_id))
    return answer({"id": token_id, "holds": False})
