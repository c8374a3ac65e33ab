"""What stands before every route: size, origin, and what nobody foresaw."""

import re
from urllib.parse import urlsplit

from fastapi import Request, Response
from starlette.concurrency import run_in_threadpool
from starlette.types import ASGIApp, Message, Receive, Scope, Send

from server.lab.refusal import Refusal
from server.web.errors import answer_incident, refuse
from server.web.refusals import NotFromHere, TooLarge, Unreadable

MOST_BODY = 2 * 1024 * 1024
#: What a curve's original of 5 MB takes as base64 text, with the entry around it.
MOST_CURVE_BODY = 7 * 1024 * 1024
_CURVES = re.compile(r"/api/sheets/[^/]{1,80}/(entries|curves/preview)")
_SAFE = frozenset({"GET", "HEAD", "OPTIONS"})
_OWN_SITES = frozenset({"same-origin", "none"})


class Incidents:
    """Answers an error that nobody foresaw with a number, under which it is logged."""

    def __init__(self, app: ASGIApp) -> None:
        self._app = app

    async def __call__(self, scope: Scope, receive: Receive, send: Send) -> None:
        """Pass a request on; answer for whatever breaks before the answer has begun."""
        if scope["type"] != "http":
            await self._app(scope, receive, send)
            return
        begun = False

        async def watch(message: Message) -> None:
            nonlocal begun
            begun = begun or message["type"] == "http.response.start"
            await send(message)

        try:
            await self._app(scope, receive, watch)
        except Exception as problem:
            request = Request(scope)
            response = await run_in_threadpool(answer_incident, request, problem)
            if begun:
                raise
            await response(scope, receive, send)


class Heads:
    """Answers HEAD as GET is answered, without the body."""

    def __init__(self, app: ASGIApp) -> None:
        self._app = app

    async def __call__(self, scope: Scope, receive: Receive, send: Send) -> None:
        """Pass a request on; of the answer to HEAD only what stands before the body."""
        if scope["type"] != "http" or scope["method"] != "HEAD":
            await self._app(scope, receive, send)
            return

        async def send_head(message: Message) -> None:
            if message["type"] == "http.response.body":
                message = {**message, "body": b""}
            await send(message)

        await self._app({**scope, "method": "GET"}, receive, send_head)


class Guards:
    """Refuses what is too large, comes from another site, or holds what no text can hold."""

    def __init__(self, app: ASGIApp) -> None:
        self._app = app

    async def __call__(self, scope: Scope, receive: Receive, send: Send) -> None:
        """Pass a request on unless a guard refuses it."""
        if scope["type"] != "http":
            await self._app(scope, receive, send)
            return
        request = Request(scope)
        refusal = _refusal(request)
        if refusal is not None:
            response: Response = await run_in_threadpool(refuse, request, refusal)
            await response(scope, receive, send)
            return
        if scope["method"] == "HEAD":
            # answered as a GET; the server below sends no body for it
            scope = {**scope, "method": "GET"}
        await self._app(scope, _counted(receive, _most_body(scope["path"])), send)


def _refusal(request: Request) -> Refusal | None:
    path, query = request.scope["path"], request.scope["query_string"]
    if "\0" in path or b"%00" in query:
        return Unreadable("The address holds a character that no text has.")
    length = request.headers.get("content-length", "0")
    most = _most_body(path)
    if not length.isdigit() or int(length) > most:
        return _too_large(most)
    if request.method in _SAFE or _is_from_here(request):
        return None
    return NotFromHere("This was sent from another site; nothing was done.")


def _is_from_here(request: Request) -> bool:
    """Say whether a write was sent by a page of this server, or by no page at all."""
    headers = request.headers
    site = headers.get("sec-fetch-site", "none")
    if site not in _OWN_SITES:
        return False
    origin = headers.get("origin")
    if origin is None:
        return True
    if origin == "null":
        # a page without referrers sends its own forms so; only the browser's word tells them apart
        return site == "same-origin"
    sent = urlsplit(origin)
    return bool(sent.netloc) and _host(sent.netloc) == _host(headers.get("host", ""))


def _host(netloc: str) -> str:
    """Return a host and port; a scheme's usual port is not written."""
    return netloc.lower().removesuffix(":443").removesuffix(":80")


def _most_body(path: str) -> int:
    """Return how many bytes a request may bring: more where curves come with their originals."""
    return MOST_CURVE_BODY if _CURVES.fullmatch(path) else MOST_BODY


def _too_large(most: int) -> TooLarge:
    return TooLarge(f"This is more than {most // 1024} kB, the most that is taken at once.")


def _counted(receive: Receive, most: int) -> Receive:
    """Return a receiver that refuses a body without a stated length once it grows too large."""
    seen = 0

    async def counted() -> Message:
        nonlocal seen
        message = await receive()
        if message["type"] == "http.request":
            seen += len(message.get("body", b""))
            if seen > most:
                raise _too_large(most)
        return message

    return counted
