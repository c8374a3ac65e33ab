"""The headers that every answer carries."""

from collections.abc import Iterable, Mapping

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


def _raw(headers: Mapping[str, str]) -> list[tuple[bytes, bytes]]:
    """Return headers as they are sent: made once, for every answer carries them."""
    return [(name.lower().encode(), value.encode()) for name, value in headers.items()]


_RAW = _raw({**_ALWAYS, "Cache-Control": "no-store"})
_RAW_SECURE = _raw({"Referrer-Policy": "no-referrer", "Strict-Transport-Security": _YEAR})
# plain http tells no Sec-Fetch-Site, and without a referrer forms name no origin
_RAW_PLAIN = _raw({"Referrer-Policy": "same-origin"})


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
                sent = {name.lower() for name, _ in message.get("headers", ())}
                secure = self._secure or scope["scheme"] == "https"
                # a file's own policy is stricter than the one for all
                added = [one for one in _RAW if one[0] not in sent]
                added += _RAW_SECURE if secure else _RAW_PLAIN
                message = {**message, "headers": [*message.get("headers", ()), *added]}
            await send(message)

        await self._app(scope, receive, send_with_headers)
