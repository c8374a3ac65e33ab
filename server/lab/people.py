"""Names and roles of people."""

import unicodedata
from collections.abc import Iterable

from server.lab.refusal import Unacceptable
from server.lab.roles import Role

_MOST_NAME = 80
_MOST_INITIALS = 4


def check_roles(roles: Iterable[str]) -> tuple[str, ...]:
    """Return roles sorted, once each.

    Raises:
        Unacceptable: no role, one that nobody knows, or steward beside another.
    """
    wanted = sorted(set(roles))
    known = [role.value for role in Role]
    for role in wanted:
        if role not in known:
            says = f"“{role}” is no role; roles are {', '.join(known)}."
            raise Unacceptable(says, field="roles", example="analyst")
    if not wanted:
        raise Unacceptable("Give at least one role.", field="roles", example="analyst")
    if Role.STEWARD in wanted and len(wanted) > 1:
        says = "A steward keeps people and settings and holds no other role."
        raise Unacceptable(says, field="roles", example="steward")
    return tuple(wanted)


def check_name(text: str, field: str, *, example: str) -> str:
    """Return a name without outer spaces; markup and control characters are only characters."""
    name = unicodedata.normalize("NFC", text).strip()
    if not name or len(name) > _MOST_NAME or any(not c.isprintable() for c in name):
        says = f"{field} takes 1 to {_MOST_NAME} printable characters."
        raise Unacceptable(says, field=field, example=example)
    return name


def read_initials(text: str) -> str:
    """Return initials as given, without outer spaces; empty where none are given."""
    if not text.strip():
        return ""
    initials = check_name(text, "initials", example="ML")
    if len(initials) > _MOST_INITIALS:
        says = f"initials takes up to {_MOST_INITIALS} characters."
        raise Unacceptable(says, field="initials", example="ML")
    return initials


def sign_in_key(name: str) -> str:
    """Return the spelling of a sign-in name that is kept: case and outer spaces do not count."""
    return unicodedata.normalize("NFKC", name).strip().casefold()


def initials_of(printed_name: str) -> str:
    """Return initials for a name: the first letters of its first and last words."""
    words = [word for word in printed_name.split() if word[0].isalnum()]
    if not words:
        return "?"
    letters = words[0][0] + (words[-1][0] if len(words) > 1 else "")
    return letters.upper()
