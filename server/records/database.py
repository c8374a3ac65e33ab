"""The engine of a database: SQLite in a file, or PostgreSQL."""

import sqlite3
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from sqlalchemy import URL, Connection, Engine, create_engine, event, make_url
from sqlalchemy.exc import ArgumentError, NoSuchModuleError, OperationalError

#: Execution option that makes SQLite take the write lock when a transaction begins.
IMMEDIATE = "begin_immediate"
_BUSY_MS = 10_000


class DatabaseProblem(ValueError):
    """A database that cannot be opened, in a sentence."""


@dataclass(frozen=True, slots=True)
class Database:
    """One engine that writes and one that only reads."""

    url: URL
    engine: Engine
    reader: Engine

    @property
    def is_sqlite(self) -> bool:
        """Whether this is a SQLite file, which one process uses alone."""
        return self.url.get_backend_name() == "sqlite"

    def dispose(self) -> None:
        """Close all connections."""
        self.engine.dispose()
        self.reader.dispose()


def sqlite_url(path: Path) -> str:
    """Return the URL of a SQLite file."""
    return f"sqlite:///{path}"


def open_database(url: str) -> Database:
    """Return the database at a URL; ``postgresql://`` uses psycopg.

    Raises:
        DatabaseProblem: no URL, a database of another kind, or one that cannot be reached.
    """
    try:
        database = _opened(url)
        with database.reader.connect():
            return database
    except (ArgumentError, OperationalError, NoSuchModuleError) as problem:
        cause = str(getattr(problem, "orig", None) or problem).strip().splitlines()[0]
        raise DatabaseProblem(f"The database cannot be opened: {cause}") from problem


def _opened(url: str) -> Database:
    parsed = make_url(url)
    backend = parsed.get_backend_name()
    if backend == "sqlite":
        return _sqlite(parsed)
    if backend == "postgresql":
        return _postgresql(parsed.set(drivername="postgresql+psycopg"))
    says = f"The database is SQLite or PostgreSQL, not {backend}."
    raise DatabaseProblem(says)


def _sqlite(url: URL) -> Database:
    writer, reader = (create_engine(url, connect_args={"timeout": 10}) for _ in range(2))
    for engine, query_only in ((writer, False), (reader, True)):
        _prepare_sqlite(engine, query_only=query_only)
    return Database(url, writer, reader)


def _prepare_sqlite(engine: Engine, *, query_only: bool) -> None:
    """Let SQLAlchemy begin by itself: the driver's own way loses DDL and savepoints."""

    @event.listens_for(engine, "connect")
    def _on_connect(connection: sqlite3.Connection, _: Any) -> None:
        connection.isolation_level = None
        cursor = connection.cursor()
        cursor.execute(f"PRAGMA busy_timeout = {_BUSY_MS}")
        if not query_only:
            cursor.execute("PRAGMA journal_mode = WAL")
        cursor.execute("PRAGMA synchronous = FULL")
        cursor.execute("PRAGMA foreign_keys = ON")
        cursor.execute(f"PRAGMA query_only = {'ON' if query_only else 'OFF'}")
        cursor.close()

    @event.listens_for(engine, "begin")
    def _on_begin(connection: Connection) -> None:
        immediate = connection.get_execution_options().get(IMMEDIATE, False)
        connection.exec_driver_sql("BEGIN IMMEDIATE" if immediate else "BEGIN")


def _postgresql(url: URL) -> Database:
    # a writer waits for another one's row, or for the same idempotency key, five seconds at most
    writer = create_engine(url, connect_args={"options": "-c lock_timeout=5000"}, pool_size=10)
    reader = create_engine(
        url,
        isolation_level="REPEATABLE READ",
        execution_options={"postgresql_readonly": True},
        pool_size=10,
    )
    return Database(url, writer, reader)
