"""Checking that lots and bottles are those whose making and filling the trail noted."""

from datetime import UTC, datetime, timedelta
from typing import Any, NamedTuple

from sqlalchemy.orm import Session

from server.records.queries.load_shelf_kept import (
    FILLED,
    MADE_UP,
    Shelved,
    things_as_they_stand,
)
from server.records.trail import DoesNotHold, read_body

_EPOCH = datetime(1970, 1, 1, tzinfo=UTC)
_WORDS = {MADE_UP: "lot", FILLED: "bottle"}
#: What may change after the filling, each time by an act of its own.
_MAY_CHANGE = frozenset({"place"})
#: What earlier releases did not note; there it is not held.
_NOTED_LATER = frozenset({"medium"})


class _Noted(NamedTuple):
    seq: int
    name: str
    person_id: str | None
    at: datetime
    body: dict[str, Any]


class ShelfCheck:
    """What the trail noted of lots and bottles, row by row, and then what stands there."""

    def __init__(self) -> None:
        self._noted: dict[tuple[str, str], _Noted] = {}

    def take(self, row: Any) -> None:
        """Remember a row of the trail if it tells of a lot's making or a bottle's filling."""
        if row.act in _WORDS:
            at = _EPOCH + timedelta(microseconds=row.at)
            noted = _Noted(row.seq, row.thing_name, row.person_id, at, read_body(row))
            self._noted[row.act, row.thing_id] = noted

    def check(self, session: Session) -> int:
        """Return how many bottles are as they were noted.

        Raises:
            DoesNotHold: a lot or bottle is another than noted, was never noted, or is gone.
        """
        bottles = 0
        for one in list(things_as_they_stand(session)):
            noted = self._noted.pop((one.act, one.thing_id), None)
            if noted is None:
                says = f"The {_WORDS[one.act]} {one.name} was never noted in the trail."
                raise DoesNotHold(says)
            _compare(one, noted)
            bottles += one.act == FILLED
        for (act, _), gone in self._noted.items():
            says = f"The {_WORDS[act]} {gone.name}, noted in row {gone.seq}, is not there."
            raise DoesNotHold(says)
        return bottles


def _compare(one: Shelved, noted: _Noted) -> None:
    stands = {
        key: value
        for key, value in one.body.items()
        if key in noted.body or key not in _NOTED_LATER
    }
    told = {key: value for key, value in noted.body.items() if key not in _MAY_CHANGE}
    here = (one.name, one.person_id, one.at, stands)
    if here != (noted.name, noted.person_id, noted.at, told):
        says = f"The {_WORDS[one.act]} {one.name} is not the one that row {noted.seq} noted."
        raise DoesNotHold(says)
