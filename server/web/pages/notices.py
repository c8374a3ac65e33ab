"""Watching bottles and lots, and what is told of them."""

from fastapi import APIRouter, Response

from server.procedures.watches import (
    ReadNotices,
    SendNotices,
    StopWatching,
    WatchThing,
    read_notices,
    send_notices,
    stop_watching,
    watch_thing,
)
from server.sheets.notices_page import open_notices
from server.web.forms.posts import Again, Posted
from server.web.showing import show
from server.web.visits import AtDesk

router = APIRouter()
_PAGE = "notices/home.html"
_PLACES = {"bottle": "/b/", "lot": "/lots/"}


@router.get("/notices")
def home(visit: AtDesk) -> Response:
    """Show what was told of the things that one watches."""
    sends = visit.parts.sends_mail
    return show(visit, _PAGE, lambda session, **who: open_notices(session, sends_mail=sends, **who))


@router.post("/notices/read")
def read(post: Posted) -> Response:
    """Count the notices up to an instant as read."""

    def work() -> str:
        post.act(read_notices, ReadNotices(post.form.text("until")))
        return "/notices"

    return post.answer(work)


@router.post("/notices/address")
def address(post: Posted) -> Response:
    """Send notices by e-mail as well, or no longer."""
    sends = post.visit.parts.sends_mail

    def work() -> str:
        post.act(send_notices, SendNotices(post.form.text("address")))
        return "/notices"

    def opened(session: object, **who: object) -> object:
        return open_notices(session, sends_mail=sends, **who)  # type: ignore[arg-type]

    return post.answer(work, again=Again(_PAGE, opened))


@router.post("/watch")
def watch(post: Posted) -> Response:
    """Watch a bottle or lot from now on."""

    def work() -> str:
        command = WatchThing(post.form.text("kind"), post.form.text("thing"))
        post.act(watch_thing, command)
        return _PLACES[command.kind] + command.thing

    return post.answer(work)


@router.post("/watch/stop")
def stop(post: Posted) -> Response:
    """Watch a bottle or lot no longer."""

    def work() -> str:
        command = StopWatching(post.form.text("kind"), post.form.text("thing"))
        post.act(stop_watching, command)
        if post.form.text("back") == "notices":
            return "/notices"
        return _PLACES[command.kind] + command.thing

    return post.answer(work)
