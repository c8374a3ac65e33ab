"""Entries written before there were curves: still there after the migration, still in ink."""

import pytest
from alembic import command
from alembic.config import Config
from sqlalchemy import text
from sqlalchemy.exc import DBAPIError

from server.files import find_folder
from server.records.database import open_database, sqlite_url
from server.records.migrating import current

ROW = (
    "INSERT INTO entry (id, sheet_id, position, replicate, slot, segment, text, person_id, "
    "posted_by, received_at, body_digest, late) "
    "VALUES ('e', 's', 1, 1, 'burette_end', 1, '18.64', 'p', 'p', 1, 'd', false)"
)


def upgrade(database, to):
    """Bring a database to a migration, foreign keys off as the program has them meanwhile."""
    config = Config()
    config.set_main_option("script_location", str(find_folder("migrations")))
    config.set_main_option("path_separator", "os")
    with database.engine.connect() as connection:
        connection.connection.execute("PRAGMA foreign_keys = OFF")
        with connection.begin():
            config.attributes["connection"] = connection
            command.upgrade(config, to)


@pytest.fixture
def before(tmp_path):
    """A SQLite database as it was before the curves, with one entry."""
    database = open_database(sqlite_url(tmp_path / "ledger.sqlite"))
    upgrade(database, "0002")
    with database.engine.connect() as connection:
        connection.connection.execute("PRAGMA foreign_keys = OFF")  # the row stands alone here
        with connection.begin():
            connection.execute(text(ROW))
    yield database
    database.engine.dispose()


def test_entry_of_before_keeps_its_text_and_stays_in_ink(before):
    upgrade(before, "0003")
    with before.engine.connect() as connection:
        asked = text("SELECT text, file_id FROM entry WHERE id = 'e'")
        assert connection.execute(asked).one() == ("18.64", None)
        for statement in ("UPDATE entry SET file_id = 'f'", "DELETE FROM entry"):
            with pytest.raises(DBAPIError, match="entry is in ink"):
                connection.execute(text(statement))
    assert current(before) == "0003"
