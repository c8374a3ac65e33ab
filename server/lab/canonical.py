"""Canonical text: the one spelling of a value that digests, signatures and trail are made of."""

import hashlib
import json
from decimal import Decimal
from typing import Any


def canonical(value: Any) -> str:
    """Return the canonical text of a JSON-like value.

    UTF-8 JSON with sorted keys and no spaces; decimals as strings, floats by ``repr`` (the shortest
    digits that read back to the same double). NaN and infinities are refused, for JSON has none.
    """
    return _ENCODER.encode(value)


def digest(text: str) -> str:
    """Return the SHA-256 of a text's UTF-8 bytes, in lower-case hexadecimal."""
    return hashlib.sha256(text.encode("utf-8")).hexdigest()


def _decimal_as_text(value: Any) -> str:
    if isinstance(value, Decimal):
        return str(value)
    says = f"{type(value).__name__} has no canonical text"
    raise TypeError(says)


# made once: json.dumps would make one for every value
_ENCODER = json.JSONEncoder(
    sort_keys=True,
    ensure_ascii=False,
    separators=(",", ":"),
    allow_nan=False,
    default=_decimal_as_text,
)
