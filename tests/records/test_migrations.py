import pytest
from alembic.autogenerate import compare_metadata
from alembic.runtime.migration import MigrationContext
from sqlalchemy import text
from sqlalchemy.exc import DBAPIError

from server.records.columns import Instant, JsonText
from server.records.migrating import current, migrate, newest
from server.records.tables import bench, lots, people, shelf, stores, trail
from server.records.tables.base import Table

TABLES = (bench, lots, people, shelf, stores, trail)
INK = (
    "entry",
    "evaluation",
    "signature",
    "certificate",
    "trail",
    "recipe",
    "calibration",
    "file",
    "log",
    "bottle_use",
)


def same_type(_context, _column, _metadata_column, _type, metadata_type):
    """Own column types are their implementation in the database."""
    return False if isinstance(metadata_type, Instant | JsonText) else None


def test_migrations_from_empty_equal_the_metadata(database):
    with database.engine.connect() as connection:
        context = MigrationContext.configure(connection, opts={"compare_type": same_type})
        assert compare_metadata(context, Table.metadata) == []


def test_migrate_twice_does_nothing_more(database):
    report = migrate(database)
    assert report.before == report.after == newest() == current(database)


def test_ink_tables_all_refuse_update_and_delete(database):
    with database.engine.connect() as connection:
        names = (
            "SELECT name FROM sqlite_master WHERE type = 'trigger'"
            if database.is_sqlite
            else "SELECT tgname FROM pg_trigger WHERE NOT tgisinternal"
        )
        triggers = set(connection.execute(text(names)).scalars())
    wanted = {f"{table}_no_{event}" for table in INK for event in ("update", "delete")}
    assert wanted <= triggers


def test_trail_head_cannot_be_deleted(database):
    with database.engine.connect() as connection, pytest.raises(DBAPIError, match="kept"):
        connection.execute(text("DELETE FROM trail_head"))


@pytest.mark.parametrize("table", ["trail", "device"])
def test_replacing_a_row_is_refused_where_rows_are_kept(sqlite_database, table):
    columns = {
        "trail": "(seq, at, zone, person_name, act, kind, thing_id, thing_name, body, "
        "previous_hash, hash) VALUES (1, 1, 'UTC', 'x', '{act}', 'k', 't', 'n', '{{}}', 'p', 'h')",
        "device": "(id, name, first_seen_at) VALUES ('d', '{act}', 1)",
    }[table]
    insert = f"INSERT OR REPLACE INTO {table} {columns}"
    with sqlite_database.engine.connect() as connection:
        connection.execute(text(insert.format(act="first")))
        if table == "device":
            connection.execute(text(insert.format(act="second")))  # nothing rests on it
            return
        with pytest.raises(DBAPIError, match="no REPLACE"):
            connection.execute(text(insert.format(act="second")))


def test_every_kept_table_refuses_replacing(sqlite_database):
    names = "SELECT name FROM sqlite_master WHERE type = 'trigger'"
    with sqlite_database.engine.connect() as connection:
        triggers = set(connection.execute(text(names)).scalars())
    kept = (*INK, "sheet", "lot", "bottle", "pull", "hold", "person", "instrument", "standard_lot")
    assert {f"{table}_no_replace_by_insert" for table in kept} <= triggers
