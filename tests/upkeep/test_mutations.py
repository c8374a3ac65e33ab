"""R110: 200 random changes of the stored trail, certificates and entries are all caught.

A chain alone cannot tell that its end was cut off or that it was hashed anew from a row on; the
anchors do: each certificate carries number and hash of the row before it. Behind the last
certificate only a hash that was kept outside the database can tell, which is why `trail check`
prints it and takes it back.
"""

from collections import Counter
from collections.abc import Callable
from random import Random
from typing import Any

import pytest
import sqlalchemy as sa
from sqlalchemy.orm import Session

from server.records.tables.bench import Certificate, Entry
from server.records.tables.trail import TrailHead, TrailRow
from server.upkeep.trail_check import check_record

MUTATIONS = 200
TABLES = (TrailRow, Certificate, Entry)
Told = tuple[str, int | None]


class Hand:
    """One random change; each says what it did, and from which row on the chain was made anew."""

    def __init__(self, session: Session, random: Random, rehash: Any) -> None:
        self._session, self._random, self._rehash = session, random, rehash

    def flip(self) -> Told:
        """Flip one bit of one value."""
        table, key, row = self._row()
        column = self._random.choice([one for one in row if row[one] not in (None, "")])
        self._set(table, key, column, self._flipped(row[column]))
        return f"flip {table.name}.{column} of {key}", None

    def delete(self) -> Told:
        """Delete one row."""
        table, key, _ = self._row()
        self._session.execute(sa.delete(table).where(_key(table) == key))
        return f"delete {table.name} {key}", None

    def swap(self) -> Told:
        """Exchange a value of two rows."""
        while True:
            table, key, row = self._row()
            rows = self._rows(table)
            other = self._random.choice(list(rows))
            column = self._random.choice(list(row))
            if rows[other][column] != row[column]:
                break
        self._set(table, key, column, _aside(row[column], rows[other][column]))
        if column == _key(table).name:
            self._set(table, other, column, key)
            self._set(table, _aside(key, other), column, other)
        else:
            self._set(table, other, column, row[column])
            self._set(table, key, column, rows[other][column])
        return f"swap {table.name}.{column} of {key} and {other}", None

    def truncate(self) -> Told:
        """Cut the end off, and let the head say that this is the end."""
        seq = self._random.randrange(2, self._last() + 1)
        self._session.execute(sa.delete(TrailRow).where(TrailRow.seq >= seq))
        before = self._session.get_one(TrailRow, seq - 1)
        self._session.execute(sa.update(TrailHead).values(seq=seq - 1, hash=before.hash))
        return f"truncate from row {seq}", seq

    def hash_anew(self) -> Told:
        """Change a row, then make the whole chain after it fit."""
        seq = self._random.randrange(1, self._last() + 1)
        row = self._rows(TrailRow.__table__)[seq]
        left = [one for one in row if row[one] and one not in ("seq", "hash", "previous_hash")]
        column = self._random.choice(left)
        self._set(TrailRow.__table__, seq, column, self._flipped(row[column]))
        self._rehash(self._session, seq)
        return f"hash anew from row {seq}, its {column} changed", seq

    def _last(self) -> int:
        return self._session.scalar(sa.select(sa.func.max(TrailRow.seq))) or 0

    def _row(self) -> tuple[sa.Table, Any, dict[str, Any]]:
        table: Any = self._random.choice(TABLES).__table__
        rows = self._rows(table)
        key = self._random.choice(list(rows))
        return table, key, rows[key]

    def _rows(self, table: Any) -> dict[Any, dict[str, Any]]:
        """All rows as the database holds them: instants are numbers, JSON is text."""
        columns = [sa.type_coerce(one, _stored(one)).label(one.name) for one in table.columns]
        found = self._session.execute(sa.select(*columns).order_by(_key(table))).mappings()
        return {row[_key(table).name]: dict(row) for row in found}

    def _set(self, table: Any, key: Any, column: str, value: Any) -> None:
        stored = sa.literal(value, _stored(table.columns[column]))
        self._session.execute(sa.update(table).where(_key(table) == key).values({column: stored}))

    def _flipped(self, value: Any) -> Any:
        if isinstance(value, bool):
            return not value
        if isinstance(value, int):
            return value ^ (1 << self._random.randrange(0, 20))
        place = self._random.randrange(len(value))
        bit = 1 << self._random.randrange(0, 5)
        return value[:place] + chr(ord(value[place]) ^ bit) + value[place + 1 :]


def _key(table: Any) -> Any:
    return next(iter(table.primary_key.columns))


def _stored(column: Any) -> Any:
    held = getattr(column.type, "impl_instance", column.type)
    return sa.BigInteger() if isinstance(held, sa.BigInteger) else held


def _aside(value: Any, other: Any) -> Any:
    """A value that no row has, for the moment between two halves of a swap."""
    return -1 if isinstance(value if value is not None else other, int) else f"aside {value}"[:36]


HANDS: tuple[Callable[[Hand], Told], ...] = (
    Hand.flip, Hand.delete, Hand.swap, Hand.truncate, Hand.hash_anew,
)  # fmt: skip


def mutate(forger: Any, count: int) -> Counter[str]:
    """Change the record so many times, each time the untouched one, and see it caught."""
    caught: Counter[str] = Counter()
    with forger.at_work() as session:
        untouched = check_record(session)
        anchor = session.scalar(sa.select(sa.func.max(Certificate.trail_seq))) or 0
    assert untouched.holds, untouched.says
    number, seed = 0, 0
    while number < count:
        random, seed = Random(seed), seed + 1
        with forger.at_work() as session:
            try:
                told, start = HANDS[number % len(HANDS)](Hand(session, random, forger.rehash))
            except sa.exc.IntegrityError:
                continue  # the database itself refused: two rows of one key
            session.expire_all()
            # kept elsewhere: needed only for what happened behind the last certificate
            behind = start is not None and start > anchor
            known = {untouched.seq: untouched.hash} if behind else None
            found = check_record(session, known=known)
        assert not found.holds, f"mutation {number} was not caught: {told}"
        assert found.says.endswith("."), found.says
        number += 1
        caught[told.split()[0] + (" behind the last anchor" if behind else "")] += 1
    return caught


def test_trail_check_catches_200_random_changes(forger: Any) -> None:
    caught = mutate(forger, MUTATIONS)
    assert sum(caught.values()) == MUTATIONS
    assert caught["truncate"] >= 20, caught  # most are caught by the certificates' anchors alone
    assert caught["hash"] >= 20, caught


@pytest.mark.postgres
def test_trail_check_catches_random_changes_on_postgresql(postgres_forger: Any) -> None:
    assert sum(mutate(postgres_forger, 40).values()) == 40
