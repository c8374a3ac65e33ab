import pytest
from sqlalchemy import text

from server.records.database import open_database


def test_open_database_other_kind_is_refused():
    with pytest.raises(ValueError, match="SQLite or PostgreSQL"):
        open_database("mysql://x/y")


def test_sqlite_writes_ahead_durably_with_foreign_keys(sqlite_database):
    with sqlite_database.engine.connect() as connection:
        pragmas = {
            name: connection.execute(text(f"PRAGMA {name}")).scalar()
            for name in ("journal_mode", "synchronous", "foreign_keys")
        }
    assert pragmas == {"journal_mode": "wal", "synchronous": 2, "foreign_keys": 1}


def test_sqlite_create_table_rolls_back(sqlite_database):
    with sqlite_database.engine.connect() as connection:
        connection.execute(text("CREATE TABLE gone (id INTEGER)"))
        connection.rollback()
        found = connection.execute(text("SELECT count(*) FROM sqlite_master WHERE name = 'gone'"))
        assert found.scalar() == 0
