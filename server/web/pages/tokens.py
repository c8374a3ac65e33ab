"""One's own tokens for scripts: made, shown once, revoked."""

from fastapi import APIRouter, Response

from server.procedures.access_tokens import MakeToken, RevokeToken, revoke_token
from server.sheets.own_page import open_own_page
from server.web.forms.posts import Again, Posted
from server.web.showing import show
from server.web.token_making import MadeToken, new_token_for

router = APIRouter()
_PAGE = "session/me.html"


@router.post("/me/tokens")
def make(post: Posted) -> Response:
    """Make a token; this page is the only one that ever shows it."""
    made: list[MadeToken] = []

    def work() -> str:
        form = post.form
        command = MakeToken(form.text("name"), form.all("scopes"), form.whole("days", example="90"))
        made.append(new_token_for(post.visit, command, form.text("password"), key=post.key))
        return "/me"

    response = post.answer(work, again=Again(_PAGE, open_own_page))
    if not made:
        return response
    return show(post.visit, _PAGE, open_own_page, made=made[0].token)


@router.post("/me/tokens/{token_id}/revoke")
def revoke(post: Posted, token_id: str) -> Response:
    """End one of one's own tokens for good."""

    def work() -> str:
        post.act(revoke_token, RevokeToken(token_id))
        return "/me"

    return post.answer(work)
