"""The chart script that the plotly package ships: packed once, under an address of its content."""

import base64
import gzip
import hashlib
import re
from functools import cached_property
from importlib.util import find_spec
from pathlib import Path
from threading import Lock

from fastapi import APIRouter, Request
from fastapi.responses import Response

from server.lab.refusal import NotFound

_NAME = "plotly.min.js"
_FOR_GOOD = "public, max-age=31536000, immutable"
_DIGITS = 16
#: The bundle makes an empty style element, and one for the maps that no page here draws.
_STYLE_TEXT = re.compile(
    r'createElement\("style"\);[^;]{0,200}?\.textContent=\'((?:[^\'\\]|\\.)*)\''
)
_JS_ESCAPES = {"n": "\n", "r": "\r", "t": "\t"}


class ChartBundle:
    """The script, read when a page asks for it first: most processes never do.

    The package is found, never imported: its Python side takes longer to start than this program.
    """

    def __init__(self, path: Path | None = None) -> None:
        self._path = path or bundle_path()
        self._lock = Lock()

    @property
    def url(self) -> str | None:
        """The address of the script, which changes with its content; None where it is not there."""
        return f"/charts/{self.digest}/{_NAME}" if self._path is not None else None

    @property
    def digest(self) -> str:
        """The beginning of the SHA-256 of the script."""
        return self._looked_at[0]

    @property
    def style_hashes(self) -> tuple[str, ...]:
        """The SHA-256 of each style sheet that the script writes into a page, as a policy has them.

        Styles are hashed from the script itself, so that a new release of the package needs none
        of them typed anew.
        """
        return self._looked_at[1] if self._path is not None else ()

    @cached_property
    def _looked_at(self) -> tuple[str, tuple[str, ...]]:
        content = self._content()
        texts = ["", *(_unescaped(one) for one in _STYLE_TEXT.findall(content.decode()))]
        hashes = tuple(f"'sha256-{_sha256(text)}'" for text in texts)
        return hashlib.sha256(content).hexdigest()[:_DIGITS], hashes

    def packed(self) -> bytes:
        """Return the script, gzipped once."""
        with self._lock:
            return self._packed

    @cached_property
    def _packed(self) -> bytes:
        return gzip.compress(self._content(), mtime=0)

    def plain(self) -> bytes:
        """Return the script as it is, for a browser that unpacks nothing."""
        return self._content()

    def _content(self) -> bytes:
        if self._path is None:
            raise NotFound("There is no chart script here; the pictures of the page are whole.")
        return self._path.read_bytes()


def bundle_path() -> Path | None:
    """Return where the package keeps the script, None where there is no package."""
    spec = find_spec("plotly")
    if spec is None or spec.origin is None:
        return None
    path = Path(spec.origin).parent / "package_data" / _NAME
    return path if path.is_file() else None


def chart_router(bundle: ChartBundle) -> APIRouter:
    """Return the route that serves the script."""
    router = APIRouter(include_in_schema=False)

    @router.get(f"/charts/{{digest}}/{_NAME}")
    def serve(request: Request, digest: str) -> Response:
        """Serve the script; an address of an older release gets today's, to be asked again."""
        fresh = digest == bundle.digest
        headers = {
            "Cache-Control": _FOR_GOOD if fresh else "no-cache",
            "Vary": "Accept-Encoding",
        }
        packs = "gzip" in request.headers.get("accept-encoding", "")
        if packs:
            headers["Content-Encoding"] = "gzip"
        body = bundle.packed() if packs else bundle.plain()
        return Response(body, media_type="text/javascript; charset=utf-8", headers=headers)

    return router


def _sha256(text: str) -> str:
    return base64.b64encode(hashlib.sha256(text.encode()).digest()).decode()


def _unescaped(literal: str) -> str:
    """Return what a literal of the script stands for: only its simple escapes occur in styles."""
    return re.sub(r"\\(.)", lambda m: _JS_ESCAPES.get(m[1], m[1]), literal)
