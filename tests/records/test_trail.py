import hashlib
import json
from concurrent.futures import ThreadPoolExecutor
from datetime import UTC, datetime

import pytest
from sqlalchemy import select, text
from sqlalchemy.exc import DBAPIError

from server.records.tables.trail import TrailRow
from server.records.trail import GENESIS, check, hash_of, head, note

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


@pytest.mark.parametrize("why", [None, "", 'a "quoted" \\ line\n\ttab \x1f \u2028 Ω € 𝛼'])
def test_hash_of_a_row_is_that_of_its_canonical_text(transactions, why):
    """The check spells that text out for speed; here it is made by the general writer of JSON."""
    transactions.write(
        lambda session: note(
            session, actor=None, act="wrote", kind="sheet", thing_id="s1", thing_name='S "1" \\ Ω',
            why=why, body={"text": '18.60 "', "n": 1}, now=NOW, zone="Europe/Berlin",
        )
    )  # fmt: skip

    def compare(session):
        row = session.scalars(select(TrailRow)).one()
        named = ("seq", "zone", "person_id", "person_name", "act", "kind", "thing_id",
                 "thing_name", "why", "body")  # fmt: skip
        said = {name: getattr(row, name) for name in named} | {"at": row.at.isoformat()}
        text = json.dumps(said, sort_keys=True, ensure_ascii=False, separators=(",", ":"))
        wanted = hashlib.sha256(f"{row.previous_hash}\n{text}".encode()).hexdigest()
        assert row.hash == hash_of(row) == wanted

    transactions.read(compare)
    assert transactions.read(check).holds


def test_check_of_the_newest_rows_begins_where_it_says(sqlite_transactions):
    for _ in range(6):
        write(sqlite_transactions)
    found = sqlite_transactions.read(lambda session: check(session, newest=2))
    assert (found.holds, found.rows, found.seq) == (True, 2, 6)
    assert "newest 2 rows, from 5 to 6" in found.says
    assert sqlite_transactions.read(lambda session: check(session, newest=99)).rows == 6
