"""Watching bottles and lots over the API, and reading what is told of them."""

from typing import Annotated

from fastapi import APIRouter, Depends, Response

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
from server.web.api.desk import AtApi, answer
from server.web.bodies import Given, body_of
from server.web.visits import AtDesk

router = APIRouter(tags=["notices"])
_WATCH, _STOP = body_of(WatchThing), body_of(StopWatching)
_READ, _SEND = body_of(ReadNotices), body_of(SendNotices)


@router.get("/notices")
def notices(visit: AtDesk) -> Response:
    """List what was told of the things that one watches, newest first."""
    return answer(visit.read(open_notices, sends_mail=visit.parts.sends_mail))


@router.post("/watches", openapi_extra=_WATCH.openapi, status_code=201)
def watch(desk: AtApi, given: Annotated[Given, Depends(_WATCH)]) -> Response:
    """Watch a bottle or lot from now on."""
    return answer({"id": desk.act(watch_thing, WatchThing(**given))}, status=201)


@router.post("/watches/stop", openapi_extra=_STOP.openapi)
def stop(desk: AtApi, given: Annotated[Given, Depends(_STOP)]) -> Response:
    """Watch a bottle or lot no longer."""
    desk.act(stop_watching, StopWatching(**given))
    return answer({"thing": given["thing"], "watched": False})


@router.post("/notices/read", openapi_extra=_READ.openapi)
def read(desk: AtApi, given: Annotated[Given, Depends(_READ)]) -> Response:
    """Count the notices up to an instant as read."""
    desk.act(read_notices, ReadNotices(**given))
    return answer({"read_until": given["until"]})


@router.post("/notices/address", openapi_extra=_SEND.openapi)
def address(desk: AtApi, given: Annotated[Given, Depends(_SEND)]) -> Response:
    """Send notices by e-mail as well, or no longer."""
    desk.act(send_notices, SendNotices(**given))
    return answer({"address": given["address"]})
