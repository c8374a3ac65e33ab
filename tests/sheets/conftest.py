"""The demonstration laboratory as the sheets read it, made once; a copy for tests that write."""

import sqlite3
from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace
from datetime import UTC, datetime
from pathlib import Path
from typing import Any
from uuid import uuid4

import pytest
import sqlalchemy as sa
from sqlalchemy.orm import Session

from server.demo.laboratory import DemoSummary, fill_demo
from server.lab.actor import Actor
from server.records.database import Database, open_database, sqlite_url
from server.records.tables.bench import Entry, Sheet, Signature
from server.records.tables.people import Person
from server.records.transaction import Transactions

NOW = datetime(2026, 12, 1, 13, 5, tzinfo=UTC)
ZONE = "Europe/Zurich"


@dataclass(frozen=True)
class Demo:
    """The demo laboratory: reading it as somebody, and counting the statements of a reading."""

    transactions: Transactions
    summary: DemoSummary
    people: dict[str, Actor]
    now: datetime = NOW

    def read(self, opened: Callable[..., Any], *given: Any, who: str | None, **more: Any) -> Any:
        actor = None if who is None else self.people[who]
        return self.transactions.read(
            lambda session: opened(session, *given, actor=actor, now=self.now, **more)
        )

    def statements(self, opened: Callable[..., Any], *given: Any, **more: Any) -> int:
        seen: list[str] = []

        def note(*told: Any) -> None:
            seen.append(told[2])

        engine = self.transactions.database.reader
        sa.event.listen(engine, "before_cursor_execute", note)
        try:
            self.read(opened, *given, **more)
        finally:
            sa.event.remove(engine, "before_cursor_execute", note)
        return len(seen)

    def write(self, work: Callable[[Session], Any]) -> Any:
        return self.transactions.write(work)

    @staticmethod
    def twin(session: Session, row: Any, **changes: Any) -> Any:
        """Add a second row like one that is there."""
        columns = {one.key: getattr(row, one.key) for one in sa.inspect(type(row)).column_attrs}
        new = type(row)(**columns | {"id": str(uuid4())} | changes)
        session.add(new)
        session.flush()
        return new

    def twin_sheet(self, session: Session, sheet_id: str, **changes: Any) -> str:
        """Add a second sheet like one that is there, with its entries and signatures."""
        row = session.get_one(Sheet, sheet_id)
        count = session.scalar(sa.select(sa.func.count()).select_from(Sheet))
        new = self.twin(session, row, number=f"S-2026-1{count:03d}", **changes)
        for table in (Entry, Signature):
            for one in session.scalars(sa.select(table).where(table.sheet_id == sheet_id)).all():
                more = {"device_id": None, "strikes": None} if table is Entry else {}
                self.twin(session, one, sheet_id=new.id, **more)
        return new.id

    def at(self, now: datetime) -> "Demo":
        return replace(self, now=now)

    def without_triggers(self) -> None:
        """Let a test change what nobody may change, to see that it is noticed."""
        with self.transactions.database.engine.connect() as connection, connection.begin():
            names = connection.exec_driver_sql(
                "SELECT name FROM sqlite_master WHERE type = 'trigger'"
            ).scalars()
            for name in names.all():
                connection.exec_driver_sql(f'DROP TRIGGER "{name}"')


def actors_of(transactions: Transactions) -> dict[str, Actor]:
    def load(session: Session) -> dict[str, Actor]:
        return {
            one.sign_in_name: Actor(
                one.id, one.printed_name, one.initials, frozenset(one.roles), ZONE
            )
            for one in session.scalars(sa.select(Person))
        }

    return transactions.read(load)


@pytest.fixture(scope="session")
def demo(fresh_sqlite: Callable[[], Database]) -> Iterator[Demo]:
    """The demo laboratory; nobody writes in this one."""
    transactions = Transactions(fresh_sqlite())
    summary = fill_demo(transactions, now=NOW, zone=ZONE, progress=lambda _: None)
    yield Demo(transactions, summary, actors_of(transactions))
    transactions.close()


@pytest.fixture
def own_demo(demo: Demo, tmp_path: Path) -> Iterator[Demo]:
    """A copy of the demo laboratory for one test to write in."""
    path = tmp_path / "own.sqlite"
    source = sqlite3.connect(demo.transactions.database.url.database or "")
    target = sqlite3.connect(path)
    source.backup(target)
    source.close()
    target.close()
    transactions = Transactions(open_database(sqlite_url(path)))
    yield replace(demo, transactions=transactions)
    transactions.close()
