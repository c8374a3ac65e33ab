"""The look-up of a bottle for whoever brings no session, token or question: the label's own way."""

from starlette.requests import Request
from starlette.responses import JSONResponse, PlainTextResponse, Response
from starlette.routing import Match, Route
from starlette.types import Scope

from server.lab.refusal import NotFound
from server.sheets.known_bottles import KnownBottles
from server.web.api.bottles import bottle, one_line, wants_text
from server.web.parts import Parts

_ASKS_FOR_MORE = frozenset({b"cookie", b"authorization"})


class QuickLookUp(Route):
    """Stands before the route of the same address and takes the plain case from it."""

    def __init__(self, path: str, parts: Parts) -> None:
        known = KnownBottles(parts.transactions)

        async def answer(request: Request) -> Response:
            code = request.path_params["code"]
            try:
                found = known.look_up(code, now=parts.clock())
            except NotFound:
                return await bottle(request, code)  # it counts who guesses, and names codes near
            if wants_text(request):
                return PlainTextResponse(one_line(found))
            return JSONResponse(found)

        super().__init__(path, answer, methods=["GET"], include_in_schema=False)

    def matches(self, scope: Scope) -> tuple[Match, Scope]:
        """Match where nobody says who he is, and nothing is asked beside the code."""
        if scope["type"] != "http" or scope.get("query_string"):
            return Match.NONE, {}
        if any(name in _ASKS_FOR_MORE for name, _ in scope["headers"]):
            return Match.NONE, {}
        match, child = super().matches(scope)
        return (match, child) if match is Match.FULL else (Match.NONE, {})
