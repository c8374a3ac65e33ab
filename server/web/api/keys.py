"""The laboratory's public keys, for whoever verifies a signed certificate."""

from fastapi import APIRouter, Request, Response
from fastapi.responses import JSONResponse

from server.web.parts import parts_of

router = APIRouter(tags=["certificates"])


@router.get("/.well-known/jwks.json")
def keys(request: Request) -> Response:
    """Tell the keys that certificates are and were signed with (RFC 7517), the newest first."""
    return JSONResponse(parts_of(request).keys.jwks(), media_type="application/jwk-set+json")
