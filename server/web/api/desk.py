"""Who asks over the API: the same session, and the token that a write carries in a header."""

from collections.abc import Callable, Mapping
from dataclasses import asdict, dataclass, is_dataclass
from typing import Annotated, Any

from fastapi import Depends, Request, Response
from fastapi.responses import JSONResponse

from server.web.acting import act
from server.web.refusals import NotFromHere
from server.web.visits import AtDesk, Visit

TOKEN_HEADER = "X-Form-Token"  # noqa: S105 - a header's name
KEY_HEADER = "Idempotency-Key"

#: What every route may answer with beside its own.
PROBLEMS: dict[int | str, dict[str, Any]] = {
    "4XX": {
        "description": "Refused: what is wrong, and with which field.",
        "content": {
            "application/problem+json": {
                "schema": {
                    "type": "object",
                    "required": ["type", "title", "status", "detail"],
                    "properties": {
                        "type": {"type": "string"},
                        "title": {"type": "string"},
                        "status": {"type": "integer"},
                        "detail": {"type": "string"},
                        "field": {"type": "string"},
                        "example": {"type": "string"},
                        "shown": {"type": "object"},
                        "incident": {"type": "string"},
                    },
                }
            }
        },
    }
}


@dataclass(frozen=True, slots=True)
class Desk:
    """A write over the API by who is signed in; ``key`` is its idempotency key, if it has one."""

    visit: Visit
    key: str | None

    def act(self, procedure: Callable[..., Any], command: Any, *more: Any, **named: Any) -> Any:
        """Let a procedure act, once where there is a key."""
        return act(self.visit, procedure, command, *more, key=self.key, **named)


def open_desk(request: Request, visit: AtDesk) -> Desk:
    """Return the desk of a write.

    A script's token needs no form token: no browser sends it by itself.

    Raises:
        NotSignedIn: nobody is signed in.
        NotFromHere: the write does not carry the session's token.
    """
    visit.person  # noqa: B018 - refuses who is not signed in
    if visit.bearer is None and not visit.holds_token(request.headers.get(TOKEN_HEADER, "")):
        says = f"Send the session's form token in {TOKEN_HEADER}; GET /api/session tells it."
        raise NotFromHere(says, field=TOKEN_HEADER)
    return Desk(visit, request.headers.get(KEY_HEADER))


AtApi = Annotated[Desk, Depends(open_desk)]


def answer(sheet: Any, *, status: int = 200, headers: Mapping[str, str] | None = None) -> Response:
    """Return a read model or a plain value as JSON."""
    content = asdict(sheet) if is_dataclass(sheet) and not isinstance(sheet, type) else sheet
    return JSONResponse(content, status, headers=headers)


def made(url: str, **told: Any) -> Response:
    """Return what was made, with its address."""
    return answer({**told, "url": url}, status=201, headers={"Location": url})
