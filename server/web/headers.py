"""The headers that every answer carries."""

from collections.abc import Iterable

from starlette.datastructures import MutableHeaders
from starlette.types import ASGIApp, Message, Receive, Scope, Send

#: Scripts, styles, pictures and requests of this server alone; nothing inline, no framing.
POLICY = (
    "default-src 'none'; script-src 'self'; style-src 'self'; img-src 'self'; connect-src 'self'; "
    "form-action 'self'; base-uri 'none'; object-src 'none'; frame-ancestors 'none'"
)


def policy_with_styles(hashes: Iterable[str]) -> str:
    """Return the policy of a page on which a script writes style sheets of these SHA-256."""
    allowed = " ".join(["style-src 'self'", *hashes])
    return POLICY.replace("style-src 'self'", allowed)


_PERMISSIONS = "camera=(), geolocation=(), microphone=(), payment=(), usb=()"
#: What a page may ask for on which a code can be scanned.
CAMERA_HERE = _PERMISSIONS.replace("camera=()", "camera=(self)")
_ALWAYS = {
    "Content-Security-Policy": POLICY,
    "X-Content-Type-Options": "nosniff",
    "Permissions-Policy": _PERMISSIONS,
    "Cross-Origin-Opener-Policy": "same-origin",
    "Cross-Origin-Resource-Policy": "same-origin",
    "X-Robots-Tag": "noindex",
}
_YEAR = "max-age=31536000; includeSubDomains"


class SecurityHeaders:
    """Adds the headers; what is not a static file is never stored, for its truth may end."""

    def __init__(self, app: ASGIApp, *, secure: bool) -> None:
        self._app, self._secure = app, secure

    async def __call__(self, scope: Scope, receive: Receive, send: Send) -> None:
        """Pass a request on and its answer back with the headers."""
        if scope["type"] != "http":
            await self._app(scope, receive, send)
            return

        async def send_with_headers(message: Message) -> None:
            if message["type"] == "http.response.start":
                headers = MutableHeaders(scope=message)
                for name, value in _ALWAYS.items():
                    headers.setdefault(name, value)  # a file's own policy is stricter
                headers.setdefault("Cache-Control", "no-store")
                secure = self._secure or scope["scheme"] == "https"
                # plain http tells no Sec-Fetch-Site, and without a referrer forms name no origin
                headers["Referrer-Policy"] = "no-referrer" if secure else "same-origin"
                if secure:
                    headers["Strict-Transport-Security"] = _YEAR
            await send(message)

        await self._app(scope, receive, send_with_headers)
