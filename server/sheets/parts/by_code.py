"""Finding a bottle or lot by the code that somebody typed or scanned."""

from sqlalchemy.orm import Session

from server.lab.codes import LENGTH, nearest
from server.lab.refusal import NotFound
from server.records.queries.list_shelf import (
    BottleOnShelf,
    bottle_codes_with,
    bottle_on_shelf,
    lot_codes_with,
)
from server.records.queries.load_lots import bottle_by_code, lot_of_code
from server.records.tables.lots import Lot

_EXAMPLE = "a code of 8 characters, as on the label"
_MOST_EDITS = 2
_MOST_SHOWN = 40


def as_code(text: str) -> str:
    """Return a text as a code would be written: upper case, no spaces or hyphens."""
    return "".join(text.split()).replace("-", "").upper()


def find_bottle(session: Session, text: str) -> BottleOnShelf:
    """Return the bottle of a code, in any case.

    Raises:
        NotFound: no bottle has this code; ``shown["nearest"]`` holds codes close to it.
    """
    code = as_code(text)
    bottle = bottle_by_code(session, code) if len(code) == LENGTH else None
    if bottle is not None:
        return bottle_on_shelf(session, bottle)
    raise _not_found("bottle", text, near_bottles(session, code), "code")


def find_lot(session: Session, text: str, *, field: str = "code") -> Lot:
    """Return the lot of a code that may be one of its bottles'.

    Raises:
        NotFound: nothing has this code; ``shown["nearest"]`` holds codes close to it.
    """
    code = as_code(text)
    lot = lot_of_code(session, code) if len(code) == LENGTH else None
    if lot is not None:
        return lot
    pieces = _pieces(code)
    known = [*lot_codes_with(session, pieces), *bottle_codes_with(session, pieces)]
    raise _not_found("lot or bottle", text, nearest(code, known), field)


def near_bottles(session: Session, code: str) -> list[str]:
    """Return codes of bottles that differ from a text in at most two places."""
    return nearest(code, bottle_codes_with(session, _pieces(code)))


def _pieces(code: str) -> tuple[str, ...]:
    """Return three pieces of a code; with two wrong characters one of them is still whole.

    So the database looks for pieces, and only what it finds is compared character by character.
    What escapes is a pair of neighbours swapped across a cut with another slip in the third piece.
    """
    if abs(len(code) - LENGTH) > _MOST_EDITS:
        return ()
    first, second = (len(code) + 2) // 3, (2 * len(code) + 2) // 3
    return code[:first], code[first:second], code[second:]


def _not_found(what: str, text: str, close: list[str], field: str) -> NotFound:
    says = f"No {what} has the code “{text[:_MOST_SHOWN]}”."
    if close:
        says += f" Close to it: {', '.join(close)}."
    return NotFound(says, field=field, example=_EXAMPLE, shown={"nearest": close})
