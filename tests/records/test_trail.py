from concurrent.futures import ThreadPoolExecutor
from datetime import UTC, datetime

import pytest
from sqlalchemy import text
from sqlalchemy.exc import DBAPIError

from server.records.trail import GENESIS, check, head, note

NOW = datetime(2026, 5, 4, 8, 30, tzinfo=UTC)


def write(transactions, act="wrote"):
    transactions.write(
        lambda session: note(
            session, actor=None, act=act, kind="sheet", thing_id="s1", thing_name="S-2026-0001",
            why=None, body={"text": "18.60"}, now=NOW, zone="Europe/Berlin",
        )
    )  # fmt: skip


def test_trail_empty_holds_from_zeros(transactions):
    assert transactions.read(head) == (0, GENESIS)
    assert transactions.read(check).holds


def test_trail_rows_of_many_threads_form_one_chain(transactions):
    with ThreadPoolExecutor(10) as pool:
        list(pool.map(lambda i: write(transactions, f"act {i}"), range(40)))
    found = transactions.read(check)
    assert (found.holds, found.rows, found.seq) == (True, 40, 40)
    assert transactions.read(head) == (40, found.hash)


@pytest.mark.parametrize("statement", ["UPDATE trail SET act = 'other'", "DELETE FROM trail"])
def test_trail_row_cannot_be_changed_by_direct_sql(transactions, statement):
    write(transactions)
    with pytest.raises(DBAPIError, match="in ink"):
        transactions.write(lambda session: session.execute(text(statement)))


@pytest.mark.parametrize(
    ("statement", "says"),
    [
        ("UPDATE trail SET act = 'other' WHERE seq = 2", "Row 2 was changed"),
        ("UPDATE trail SET body = '{}' WHERE seq = 3", "Row 3 was changed"),
        ("DELETE FROM trail WHERE seq = 2", "Row 2 is missing"),
        ("DELETE FROM trail WHERE seq = 4", "rows are missing"),
        ("UPDATE trail SET previous_hash = 'x' WHERE seq = 3", "Row 3 does not follow"),
    ],
)
def test_check_row_changed_behind_the_triggers_is_named(sqlite_transactions, statement, says):
    for _ in range(4):
        write(sqlite_transactions)

    def tamper(session):
        for trigger in ("trail_no_update", "trail_no_delete"):
            session.execute(text(f"DROP TRIGGER {trigger}"))
        session.execute(text(statement))

    sqlite_transactions.write(tamper)
    found = sqlite_transactions.read(check)
    assert not found.holds
    assert says in found.says
