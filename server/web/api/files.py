"""Originals over the API."""

from fastapi import APIRouter, Response

from server.web.pages.files import hand_out
from server.web.visits import AtDesk

router = APIRouter(tags=["stores"])


@router.get("/files/{file_id}")
def original(visit: AtDesk, file_id: str) -> Response:
    """Hand out an original exactly as it came, with its SHA-256 in ``Repr-Digest``."""
    return hand_out(visit, file_id)
