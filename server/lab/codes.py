"""Codes of bottles and lots: 8 characters of 31, the last a weighted modulo-31 check."""

import re
from collections.abc import Iterable
from random import Random

from server.lab.refusal import NotFound

#: Digits and letters without I, L, O, U, V.
ALPHABET = "0123456789ABCDEFGHJKMNPQRSTWXYZ"
LENGTH = 8
_ADDRESS = re.compile(r"/[bB]/(?P<code>[0-9A-Za-z]{8})/?(?:[?#].*)?$")
_WEIGHTS = (8, 7, 6, 5, 4, 3, 2, 1)


def new_code(random: Random) -> str:
    """Return a code drawn at random with its check character."""
    body = [random.randrange(len(ALPHABET)) for _ in range(LENGTH - 1)]
    check = -sum(w * v for w, v in zip(_WEIGHTS, body, strict=False)) % len(ALPHABET)
    return "".join(ALPHABET[value] for value in (*body, check))


def holds(code: str) -> bool:
    """Say whether a code in upper case has the right length, characters and check."""
    if len(code) != LENGTH or any(character not in ALPHABET for character in code):
        return False
    total = sum(w * ALPHABET.index(c) for w, c in zip(_WEIGHTS, code, strict=True))
    return total % len(ALPHABET) == 0


def read_code(text: str) -> str:
    """Return a typed or scanned code in upper case.

    Raises:
        NotFound: it is no code; its check character does not agree.
    """
    code = "".join(text.split()).replace("-", "").upper()
    if not holds(code):
        says = f"“{text[:40]}” is no code of a bottle or lot: look at each character again."
        raise NotFound(says, field="code", example="a code of 8 characters, as on the label")
    return code


def code_in(text: str) -> str:
    """Return the code in a scanned or typed address such as ``…/b/7KQ2M4XA``, else nothing."""
    found = _ADDRESS.search(text.strip())
    code = found["code"].upper() if found else ""
    return code if holds(code) else ""


def nearest(code: str, known: Iterable[str], *, most: int = 5) -> list[str]:
    """Return known codes that differ in at most two places, nearest first."""
    wanted = "".join(code.split()).upper()
    scored = sorted((_distance(wanted, other), other) for other in known)
    return [other for distance, other in scored if distance <= 2][:most]


def _distance(one: str, other: str) -> int:
    """Edits between two short texts: change, drop, add or swap of neighbours."""
    if abs(len(one) - len(other)) > 2:
        return 99
    before: list[int] = []
    last = list(range(len(other) + 1))
    for i, a in enumerate(one, start=1):
        now = [i]
        for j, b in enumerate(other, start=1):
            cost = min(last[j] + 1, now[j - 1] + 1, last[j - 1] + (a != b))
            if i > 1 and j > 1 and a == other[j - 2] and one[i - 2] == b:
                cost = min(cost, before[j - 2] + 1)
            now.append(cost)
        before, last = last, now
    return last[-1]
