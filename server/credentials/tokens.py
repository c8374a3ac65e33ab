"""Random tokens of sessions and forms."""

import hashlib
import hmac
import secrets


def new_token() -> str:
    """Return a token of 256 random bits."""
    return secrets.token_urlsafe(32)


def token_digest(token: str) -> str:
    """Return the SHA-256 under which a token is kept; the token itself is kept nowhere."""
    return hashlib.sha256(token.encode()).hexdigest()


def same_token(one: str, other: str) -> bool:
    """Compare two tokens in constant time."""
    return hmac.compare_digest(one.encode(), other.encode())
