"""Free text that people write: kept as written, or refused; never cut."""

from server.lab.refusal import Unacceptable

MOST_REASON = 1000
MOST_REMARK = 2000
_LAID_OUT = frozenset("\n\r\t")


def check_text(text: str, field: str, *, most: int) -> None:
    """Refuse a text that is too long or holds what no record keeps (control characters)."""
    if len(text) > most:
        says = f"{field} takes up to {most} characters; this has {len(text)}."
        raise Unacceptable(says, field=field)
    if any(_is_no_text(character) for character in text):
        says = f"{field} holds a character that no text has."
        raise Unacceptable(says, field=field)


def read_text(text: str, field: str, *, most: int = MOST_REMARK) -> str:
    """Return a text without outer spaces; it may be empty."""
    check_text(text, field, most=most)
    return text.strip()


def read_reason(text: str, field: str = "reason", *, says: str, example: str) -> str:
    """Return a reason without outer spaces.

    Raises:
        Unacceptable: there is none (``says``), or it cannot be kept whole.
    """
    reason = read_text(text, field, most=MOST_REASON)
    if not reason:
        raise Unacceptable(says, field=field, example=example)
    return reason


def _is_no_text(character: str) -> bool:
    """Say whether this is a control character or half of a pair (a lone surrogate)."""
    code = ord(character)
    control = (code < 0x20 and character not in _LAID_OUT) or 0x7F <= code < 0xA0
    return control or 0xD800 <= code <= 0xDFFF
