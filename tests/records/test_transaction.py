import threading
from concurrent.futures import ThreadPoolExecutor
from datetime import UTC, datetime

import pytest
from sqlalchemy import select
from sqlalchemy.exc import DBAPIError

from server.records.queries.loading import next_number
from server.records.tables.people import Device
from server.records.tables.trail import Counter

NOW = datetime(2026, 5, 4, 8, 30, 15, 123456, tzinfo=UTC)


def device(name):
    return Device(id=name, name=name, first_seen_at=NOW)


def names(transactions):
    return set(transactions.read(lambda session: session.scalars(select(Device.id)).all()))


def test_write_returns_after_the_commit_and_keeps_microseconds(transactions):
    transactions.write(lambda session: session.add(device("one")))
    assert transactions.read(lambda session: session.get_one(Device, "one").first_seen_at) == NOW


def test_write_that_raises_keeps_nothing_of_it(transactions):
    def work(session):
        session.add(device("lost"))
        session.flush()
        raise RuntimeError("in the middle")

    with pytest.raises(RuntimeError, match="in the middle"):
        transactions.write(work)
    assert names(transactions) == set()


def test_write_neighbours_of_a_failing_one_are_kept(transactions):
    def work(name):
        def add(session):
            session.add(device(name))
            session.flush()
            if name == "bad":
                raise ValueError(name)

        return add

    with ThreadPoolExecutor(8) as pool:
        futures = {
            name: pool.submit(transactions.write, work(name)) for name in ("a", "bad", "b", "c")
        }
    assert isinstance(futures["bad"].exception(), ValueError)
    assert names(transactions) == {"a", "b", "c"}


def test_next_number_twenty_threads_lose_no_number(transactions):
    # read, add one, write: wrong on both engines without a lock on the row
    with ThreadPoolExecutor(20) as pool:
        given = list(
            pool.map(
                lambda _: transactions.write(lambda s: next_number(s, "sheet 2026")), range(100)
            )
        )
    assert sorted(given) == list(range(1, 101))
    assert transactions.read(lambda s: s.get_one(Counter, "sheet 2026").last) == 100


def test_read_cannot_write(transactions):
    def work(session):
        session.add(device("smuggled"))
        session.flush()

    with pytest.raises(DBAPIError):
        transactions.read(work)
    assert names(transactions) == set()


def test_read_sees_one_state_while_others_write(transactions):
    began, written = threading.Event(), threading.Event()

    def work(session):
        before = session.scalars(select(Device.id)).all()
        began.set()
        assert written.wait(10)
        return before, session.scalars(select(Device.id)).all()

    with ThreadPoolExecutor(1) as pool:
        reading = pool.submit(transactions.read, work)
        assert began.wait(10)
        transactions.write(lambda session: session.add(device("meanwhile")))
        written.set()
        before, after = reading.result()
    assert before == after == []


def test_write_inside_a_write_is_refused_on_sqlite(sqlite_transactions):
    with pytest.raises(RuntimeError, match="inside a write"):
        sqlite_transactions.write(lambda _: sqlite_transactions.write(lambda __: None))


def test_write_after_close_is_refused(sqlite_transactions):
    sqlite_transactions.close()
    with pytest.raises(RuntimeError, match="closed"):
        sqlite_transactions.write(lambda _: None)
