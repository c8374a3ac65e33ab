"""The demonstration laboratory as the sheets read it, made once; a copy for tests that write."""

import sqlite3
from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

import pytest
import sqlalchemy as sa
from sqlalchemy.orm import Session

from server.demo.laboratory import DemoSummary, fill_demo
from server.lab.actor import Actor
from server.records.database import Database, open_database, sqlite_url
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
