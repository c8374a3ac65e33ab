"""Whether this server answers."""

from fastapi import APIRouter, Request, Response

from server.records.queries.loading import there_is_a_laboratory
from server.web.api.desk import answer
from server.web.parts import parts_of

router = APIRouter(tags=["health"])


@router.get("/health")
def health(request: Request) -> Response:
    """Tell that the server answers and can read its database; nothing is written."""
    parts = parts_of(request)
    is_set_up = parts.transactions.read(there_is_a_laboratory)
    return answer({"status": "ok", "set_up": is_set_up, "as_of": parts.clock().isoformat()})
