"""Holding what somebody doubts, and releasing it."""

from fastapi import APIRouter, Response

from server.procedures.holds import HoldThing, ReleaseThing, hold_thing, release_thing
from server.web.forms.posts import Posted

router = APIRouter()
_PLACES = {
    "lot": "/lots/",
    "bottle": "/b/",
    "standard lot": "/stores/standard-lots/",
    "instrument": "/instruments/",
}


@router.post("/hold")
def hold(post: Posted) -> Response:
    """Hold a thing; everybody sees it at once."""

    def work() -> str:
        form = post.form
        command = HoldThing(form.text("kind"), form.text("thing"), form.text("reason"))
        post.act(hold_thing, command)
        return _PLACES[command.kind] + command.thing

    return post.answer(work)


@router.post("/release")
def release(post: Posted) -> Response:
    """Release what somebody else held."""

    def work() -> str:
        form = post.form
        command = ReleaseThing(form.text("kind"), form.text("thing"), form.text("reason"))
        post.act(release_thing, command)
        return _PLACES[command.kind] + command.thing

    return post.answer(work)
