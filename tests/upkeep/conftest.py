"""The demonstration laboratory on both engines, without its triggers, for a forger to work on."""

from collections.abc import Callable, Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from datetime import UTC, datetime
from typing import Any

import pytest
import sqlalchemy as sa
from sqlalchemy.orm import Session

from server.demo.laboratory import fill_demo
from server.records.database import Database
from server.records.tables.bench import Certificate
from server.records.tables.trail import TrailHead, TrailRow
from server.records.trail import GENESIS, TrailCheck, hash_of
from server.records.transaction import Transactions
from server.upkeep.trail_check import check_record

NOW = datetime(2026, 12, 1, 13, 5, tzinfo=UTC)


@dataclass(frozen=True)
class Forger:
    """Somebody with the database's own password: no trigger and no foreign key stops him."""

    database: Database
    transactions: Transactions

    @contextmanager
    def at_work(self) -> Iterator[Session]:
        """A session that may change anything; nothing of it stays."""
        with self.database.engine.connect() as connection:
            if self.database.is_sqlite:
                connection.connection.execute("PRAGMA foreign_keys = OFF")
            transaction = connection.begin()
            if not self.database.is_sqlite:
                connection.exec_driver_sql("SET LOCAL session_replication_role = replica")
            with Session(connection) as session:
                yield session
            transaction.rollback()

    def check_after(self, *forge: Callable[[Session], Any], **known: Any) -> TrailCheck:
        """What the check says of the record once all of this was done to it."""
        with self.at_work() as session:
            for one in forge:
                one(session)
                session.flush()
            session.expire_all()
            return check_record(session, **known)

    @staticmethod
    def rehash(session: Session, start: int, *, anchors: bool = False) -> None:
        """Make the chain from a row on fit again, its head too; the anchors if asked."""
        before = (
            session.scalar(sa.select(TrailRow.hash).where(TrailRow.seq == start - 1)) or GENESIS
        )
        rows = session.scalars(
            sa.select(TrailRow).where(TrailRow.seq >= start).order_by(TrailRow.seq)
        )
        for row in rows.all():
            row.previous_hash = before
            row.hash = before = hash_of(row)
            if anchors:
                anchored = sa.update(Certificate).where(Certificate.trail_seq == row.seq)
                session.execute(anchored.values(trail_hash=before))
            last = row.seq
        session.flush()
        session.execute(sa.update(TrailHead).values(seq=last, hash=before))


def _without_triggers(database: Database) -> None:
    with database.engine.connect() as connection, connection.begin():
        names = connection.exec_driver_sql("SELECT name FROM sqlite_master WHERE type = 'trigger'")
        for name in names.scalars().all():
            connection.exec_driver_sql(f'DROP TRIGGER "{name}"')


@pytest.fixture(scope="session")
def forger(fresh_sqlite: Callable[[], Database]) -> Iterator[Forger]:
    """At work on the demonstration in a SQLite file."""
    database = fresh_sqlite()
    transactions = Transactions(database)
    fill_demo(transactions, now=NOW, zone="Europe/Zurich", progress=lambda _: None)
    _without_triggers(database)
    yield Forger(database, transactions)
    transactions.close()


@pytest.fixture
def postgres_forger(postgres_database: Database) -> Iterator[Forger]:
    """At work on the demonstration in PostgreSQL."""
    transactions = Transactions(postgres_database)
    fill_demo(transactions, now=NOW, zone="Europe/Zurich", progress=lambda _: None)
    yield Forger(postgres_database, transactions)
    transactions.close()
