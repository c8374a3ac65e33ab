"""Whether anything was committed to a SQLite file since it was last asked: in microseconds."""

import sqlite3
import weakref

from server.records.database import Database


class Unchanged:
    """Tells a number that stays the same until another connection commits.

    It keeps a connection of its own, for SQLite counts the commits of all the others; a program
    beside this one that writes in the file is noticed just as well.
    """

    def __init__(self, database: Database) -> None:
        if not database.is_sqlite or not database.url.database:
            raise ValueError("only a SQLite file counts its commits")
        self._connection = sqlite3.connect(
            database.url.database, isolation_level=None, check_same_thread=False
        )
        self._connection.execute("PRAGMA query_only = ON")
        weakref.finalize(self, self._connection.close)

    def version(self) -> int:
        """Return that number."""
        found: int = self._connection.execute("PRAGMA data_version").fetchone()[0]
        return found
