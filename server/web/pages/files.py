"""Originals, handed out as files and never shown as pages."""

import base64
from urllib.parse import quote

from fastapi import APIRouter, Response

from server.sheets.files import open_file
from server.web.visits import AtDesk, Visit

router = APIRouter()


@router.get("/files/{file_id}")
def original(visit: AtDesk, file_id: str) -> Response:
    """Hand out an original: saved by the browser, run by nobody."""
    return hand_out(visit, file_id)


def hand_out(visit: Visit, file_id: str) -> Response:
    """Return an original with its SHA-256 (``Repr-Digest``)."""
    found = visit.read(open_file, file_id)
    digest = base64.b64encode(bytes.fromhex(found.sha256)).decode("ascii")
    response = attachment(found.content, found.name, found.media_type)
    response.headers["Repr-Digest"] = f"sha-256=:{digest}:"  # RFC 9530
    return response


def attachment(content: bytes, name: str, media_type: str) -> Response:
    """Return bytes that a browser saves under a name and does not open in this site's place."""
    plain = "".join(one if one.isascii() and one not in '"\\%;' else "_" for one in name)
    headers = {
        "Content-Disposition": f"attachment; filename=\"{plain}\"; filename*=UTF-8''{quote(name)}",
        "Content-Security-Policy": "default-src 'none'; sandbox; frame-ancestors 'none'",
    }
    return Response(content, media_type=media_type, headers=headers)
