"""Databases, real ones; the clock is the only thing that is made up."""

import os
import shutil
from collections.abc import Callable, Iterator
from datetime import UTC, datetime, timedelta
from pathlib import Path
from uuid import uuid4

import pytest
import sqlalchemy as sa

from server.records.database import Database, open_database, sqlite_url
from server.records.migrating import migrate
from server.records.transaction import Transactions

POSTGRES_URL = os.environ.get("TITRANT_LEDGER_TEST_DATABASE_URL", "")
NO_SKIP = os.environ.get("TITRANT_LEDGER_NO_SKIP", "") not in {"", "0"}


def refuse_to_skip(what: str) -> None:
    """Skip with a clear reason, or fail where a skip is not allowed."""
    if NO_SKIP:
        pytest.fail(what)
    pytest.skip(what)


@pytest.fixture(scope="session")
def missing() -> Callable[[str], None]:
    """What a fixture calls where a browser or program is missing."""
    return refuse_to_skip


class Clock:
    """A clock that stands until it is moved."""

    def __init__(self, at: datetime) -> None:
        self.at = at

    def __call__(self) -> datetime:
        return self.at

    def move(self, **span: float) -> datetime:
        self.at += timedelta(**span)
        return self.at


@pytest.fixture
def clock() -> Clock:
    return Clock(datetime(2026, 5, 4, 8, 30, tzinfo=UTC))


@pytest.fixture(scope="session")
def sqlite_template(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A SQLite file with all migrations."""
    path = tmp_path_factory.mktemp("template") / "ledger.sqlite"
    database = open_database(sqlite_url(path))
    migrate(database)
    with database.engine.connect() as connection:
        connection.connection.execute("PRAGMA wal_checkpoint(TRUNCATE)")
    database.dispose()
    return path


@pytest.fixture(scope="session")
def postgres_template() -> Iterator[str]:
    """The name of a PostgreSQL database with all migrations."""
    if not POSTGRES_URL:
        refuse_to_skip(
            "PostgreSQL is missing: set TITRANT_LEDGER_TEST_DATABASE_URL to a server's URL"
        )
    name = f"template_{uuid4().hex[:12]}"
    admin(f'CREATE DATABASE "{name}"')
    database = open_database(postgres_url(name))
    migrate(database)
    database.dispose()
    yield name
    admin(f'DROP DATABASE "{name}" WITH (FORCE)')


def postgres_url(name: str) -> str:
    return sa.make_url(POSTGRES_URL).set(database=name).render_as_string(hide_password=False)


def admin(statement: str) -> None:
    url = sa.make_url(POSTGRES_URL).set(drivername="postgresql+psycopg")
    engine = sa.create_engine(url, isolation_level="AUTOCOMMIT")
    with engine.connect() as connection:
        connection.exec_driver_sql(statement)
    engine.dispose()


@pytest.fixture
def sqlite_database(sqlite_template: Path, tmp_path: Path) -> Iterator[Database]:
    path = tmp_path / "ledger.sqlite"
    shutil.copy(sqlite_template, path)
    database = open_database(sqlite_url(path))
    yield database
    database.dispose()


@pytest.fixture
def postgres_database(request: pytest.FixtureRequest) -> Iterator[Database]:
    template = request.getfixturevalue("postgres_template")
    name = f"test_{uuid4().hex[:12]}"
    admin(f'CREATE DATABASE "{name}" TEMPLATE "{template}"')
    database = open_database(postgres_url(name))
    yield database
    database.dispose()
    admin(f'DROP DATABASE "{name}" WITH (FORCE)')


@pytest.fixture(
    params=[
        "sqlite",
        pytest.param("postgresql", marks=pytest.mark.postgres),
    ]
)
def database(request: pytest.FixtureRequest) -> Database:
    """A database with all migrations and nothing else, on each engine."""
    kind = "sqlite" if request.param == "sqlite" else "postgres"
    found: Database = request.getfixturevalue(f"{kind}_database")
    return found


@pytest.fixture
def transactions(database: Database) -> Iterator[Transactions]:
    """Transactions on each engine."""
    found = Transactions(database)
    yield found
    found.close()


@pytest.fixture
def sqlite_transactions(sqlite_database: Database) -> Iterator[Transactions]:
    """Transactions on a SQLite file alone, for what does not depend on the engine."""
    found = Transactions(sqlite_database)
    yield found
    found.close()


@pytest.fixture(scope="session")
def fresh_sqlite(
    sqlite_template: Path, tmp_path_factory: pytest.TempPathFactory
) -> Callable[[], Database]:
    """A maker of migrated SQLite databases, for fixtures that live longer than a test."""

    def make() -> Database:
        path = tmp_path_factory.mktemp("fresh") / "ledger.sqlite"
        shutil.copy(sqlite_template, path)
        return open_database(sqlite_url(path))

    return make
