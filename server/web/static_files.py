"""The files that browsers get as they are, under an address that changes with their content."""

import gzip
import hashlib
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from types import MappingProxyType

from fastapi import APIRouter, Request
from fastapi.responses import Response

from server.lab.refusal import NotFound

_TYPES: Mapping[str, str] = MappingProxyType(
    {
        ".css": "text/css; charset=utf-8",
        ".js": "text/javascript; charset=utf-8",
        ".svg": "image/svg+xml",
        ".png": "image/png",
        ".json": "application/json",
    }
)
_FOR_GOOD = "public, max-age=31536000, immutable"
_DIGITS = 16


@dataclass(frozen=True, slots=True)
class StaticFile:
    """A file with its media type, as it is and packed."""

    content: bytes
    packed: bytes
    media_type: str


class StaticFiles:
    """All static files, read once. One digest stands for all, so that modules find each other."""

    def __init__(self, folder: Path) -> None:
        self._files: dict[str, StaticFile] = {}
        whole = hashlib.sha256()
        for path in sorted(folder.rglob("*")):
            if not path.is_file() or path.suffix not in _TYPES:
                continue
            name, content = path.relative_to(folder).as_posix(), path.read_bytes()
            whole.update(f"{name}\0{len(content)}\0".encode())
            whole.update(content)
            packed = gzip.compress(content, mtime=0)
            self._files[name] = StaticFile(content, packed, _TYPES[path.suffix])
        self.digest = whole.hexdigest()[:_DIGITS]

    def url(self, name: str) -> str:
        """Return the address of a file, which changes when any file changes.

        Raises:
            KeyError: there is no such file; a template asks for something that is not shipped.
        """
        if name not in self._files:
            raise KeyError(name)
        return f"/static/{self.digest}/{name}"

    def find(self, name: str) -> StaticFile:
        """Return a file by its name.

        Raises:
            NotFound: there is no such file.
        """
        try:
            return self._files[name]
        except KeyError:
            raise NotFound("There is no such file.") from None


def static_router(files: StaticFiles) -> APIRouter:
    """Return the route that serves the static files."""
    router = APIRouter(include_in_schema=False)

    @router.get("/static/{digest}/{name:path}")
    async def serve(request: Request, digest: str, name: str) -> Response:
        """Serve a file; an address of an older release gets today's file, to be asked for again."""
        file = files.find(name)
        fresh = digest == files.digest
        headers = {
            "Cache-Control": _FOR_GOOD if fresh else "no-cache",
            "Vary": "Accept-Encoding",
        }
        body = file.content
        if "gzip" in request.headers.get("accept-encoding", ""):
            headers["Content-Encoding"] = "gzip"
            body = file.packed
        return Response(body, media_type=file.media_type, headers=headers)

    return router
