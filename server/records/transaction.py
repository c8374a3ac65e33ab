"""The only place that commits: a closure runs whole, or not at all."""

import queue
import threading
from collections.abc import Callable, Sequence
from concurrent.futures import Future
from typing import Any, TypeVar

from sqlalchemy import Connection
from sqlalchemy.exc import DBAPIError, OperationalError
from sqlalchemy.orm import Session

from server.lab.refusal import CannotWrite, SavedFirst
from server.records.database import IMMEDIATE, Database

T = TypeVar("T")

Work = Callable[[Session], Any]
_Waiting = tuple[Work, "Future[Any]"]

#: Closures that one commit carries on SQLite at most.
MOST_TOGETHER = 64
_TRIES = 5
# serialization failure, deadlock, and a row of one key that another transaction wrote first
_AGAIN = frozenset({"40001", "40P01", "23505"})
_LOCKED = "55P03"


class Transactions:
    """Runs closures ``Session -> T`` in transactions on one database."""

    def __init__(self, database: Database) -> None:
        self.database = database
        self._writer = _SqliteWriter(database) if database.is_sqlite else None
        self._told: list[Callable[[], object]] = []

    def after_commit(self, tell: Callable[[], object]) -> None:
        """Call ``tell`` after every commit from now on; it must be quick and never raise."""
        self._told.append(tell)

    def write(self, work: Callable[[Session], T]) -> T:
        """Run a closure in one transaction and return what it returns, after the commit.

        What it raises is raised here, and nothing of it is kept. The closure may run more than
        once: a serialization failure is tried again.

        Raises:
            CannotWrite: the database did not take it: full, read-only, or not there.
        """
        try:
            if self._writer is not None:
                answer = self._writer.run(work)
            else:
                answer = _write_on_postgresql(self.database, work)
        except OperationalError as problem:
            says = "The database did not take this: nothing of it was saved. Tell the steward."
            raise CannotWrite(says) from problem
        for tell in self._told:
            tell()
        return answer

    def read(self, work: Callable[[Session], T]) -> T:
        """Run a closure that only reads, on one state of the database; it is always rolled back."""
        with self.database.reader.connect() as connection, Session(connection) as session:
            return work(session)

    def close(self) -> None:
        """Finish what waits and close all connections."""
        if self._writer is not None:
            self._writer.close()
        self.database.dispose()


def _write_on_postgresql(database: Database, work: Callable[[Session], T]) -> T:
    for left in reversed(range(_TRIES)):
        try:
            with Session(database.engine, expire_on_commit=False) as session, session.begin():
                return work(session)
        except DBAPIError as problem:
            state = getattr(problem.orig, "sqlstate", None)
            if state == _LOCKED:
                says = "Somebody else is writing this at the moment; try again."
                raise SavedFirst(says) from problem
            if state not in _AGAIN or not left:
                raise
    raise AssertionError("the last try returns or raises")


class _SqliteWriter:
    """One thread that writes: closures that wait share one commit, each in its own savepoint."""

    def __init__(self, database: Database) -> None:
        self._database = database
        self._waiting: queue.SimpleQueue[_Waiting | None] = queue.SimpleQueue()
        self._thread: threading.Thread | None = None
        self._lock = threading.Lock()
        self._closed = False

    def run(self, work: Callable[[Session], T]) -> T:
        """Queue a closure and wait for its commit."""
        if threading.current_thread() is self._thread:
            raise RuntimeError("a write inside a write would wait for itself")
        answer: Future[T] = Future()
        with self._lock:
            if self._closed:
                raise RuntimeError("the database is closed")
            if self._thread is None:
                self._thread = threading.Thread(target=self._loop, name="writer", daemon=True)
                self._thread.start()
            self._waiting.put((work, answer))
        return answer.result()

    def close(self) -> None:
        """Let what waits finish, then end the thread."""
        with self._lock:
            self._closed = True
            if self._thread is not None:
                self._waiting.put(None)
        if self._thread is not None:
            self._thread.join()

    def _loop(self) -> None:
        with self._database.engine.connect() as plain:
            connection = plain.execution_options(**{IMMEDIATE: True})
            while (first := self._waiting.get()) is not None:
                batch, ended = self._with_others(first)
                self._write(connection, batch)
                if ended:
                    return

    def _with_others(self, first: _Waiting) -> tuple[list[_Waiting], bool]:
        batch = [first]
        while len(batch) < MOST_TOGETHER:
            try:
                another = self._waiting.get_nowait()
            except queue.Empty:
                break
            if another is None:
                return batch, True
            batch.append(another)
        return batch, False

    def _write(self, connection: Connection, batch: Sequence[_Waiting]) -> None:
        """Run the closures in one transaction; answer each only after the commit."""
        outcomes: list[tuple[Future[Any], Any, BaseException | None]] = []
        try:
            with connection.begin():
                outcomes = [(answer, *_in_savepoint(connection, work)) for work, answer in batch]
        except BaseException as problem:  # noqa: BLE001 - every waiting caller must hear of it
            for _, answer in batch:
                answer.set_exception(problem)
            return
        for answer, result, refused in outcomes:
            if refused is None:
                answer.set_result(result)
            else:
                answer.set_exception(refused)


def _in_savepoint(connection: Connection, work: Work) -> tuple[Any, BaseException | None]:
    session = Session(connection, join_transaction_mode="create_savepoint", expire_on_commit=False)
    with session:
        try:
            result = work(session)
            session.commit()
        except BaseException as problem:  # noqa: BLE001 - handed to the caller whose work it is
            session.rollback()
            return None, problem
    return result, None
