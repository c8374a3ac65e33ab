"""The trail check against SHA-256 of the same bytes, over many copies of the demonstration.

    python tests/bench/trail_check.py [COPIES]

Fills a SQLite file with the demonstration laboratory, copies its sheets (entries, evaluations,
signatures, certificates and the acts that note them) so many times (default 400) into one chain,
then prints the time of the check of the chain alone and of the whole check, each beside the time
of SHA-256 over the bytes of every record that it reads, one digest a record, from memory. To
reach: 10 times.
"""

import hashlib
import json
import sys
import tempfile
import time
from collections.abc import Callable, Iterator
from datetime import UTC, datetime
from pathlib import Path
from types import SimpleNamespace
from typing import Any
from uuid import NAMESPACE_OID, uuid5

import sqlalchemy as sa
from sqlalchemy.orm import Session

from server.demo.laboratory import fill_demo
from server.lab.canonical import canonical
from server.lab.ink import entry_digest
from server.lab.signing import digest_to_sign
from server.records import trail
from server.records.database import open_database, sqlite_url
from server.records.migrating import migrate
from server.records.tables.bench import Certificate, Entry, Evaluation, Sheet, Signature
from server.records.tables.trail import TrailHead, TrailRow
from server.records.transaction import Transactions
from server.upkeep.trail_check import check_trail

MOST_TIMES = 10.0
COPIES = 400
RUNS = 5
_COPIED = (Sheet, Evaluation, Entry, Signature, Certificate)
_IDS = ("id", "sheet_id", "evaluation_id", "replaces_id", "strikes", "thing_id")
Rows = dict[Any, list[dict[str, Any]]]


class Copies:
    """The demonstration's sheets again and again, each under ids and numbers of its own."""

    def __init__(self, session: Session) -> None:
        self._session = session
        self._rows: Rows = {table: self._read(table) for table in _COPIED}
        self._ids = {one["id"] for rows in self._rows.values() for one in rows}
        self._acts = [one for one in self._read(TrailRow) if one["thing_id"] in self._ids]
        self._seq, self._hash = trail.head(session)
        self._hashes = {self._seq: self._hash}

    def _read(self, table: Any) -> list[dict[str, Any]]:
        # strikes and replaced certificates come after what they point at
        orders: dict[Any, Any] = {Entry: Entry.position, Certificate: Certificate.trail_seq}
        order = orders.get(table, next(iter(table.__table__.primary_key)))
        rows = self._session.execute(sa.select(*table.__table__.columns).order_by(order))
        return [dict(one) for one in rows.mappings()]

    def add(self, number: int) -> None:
        """Write one more copy and the acts that note it."""
        rows = {
            table: [self._renamed(one, number) for one in found]
            for table, found in self._rows.items()
        }
        self._sign(rows)
        acts = [self._act(one, number, rows) for one in self._acts]
        for table in _COPIED:
            self._session.execute(sa.insert(table), rows[table])
        self._session.execute(sa.insert(TrailRow), acts)

    def finish(self) -> None:
        """Let the head say where the chain ends now."""
        self._session.execute(sa.update(TrailHead).values(seq=self._seq, hash=self._hash))

    def _renamed(self, row: dict[str, Any], number: int) -> dict[str, Any]:
        new = {name: self._id(row[name], number) for name in _IDS if row.get(name) in self._ids}
        if "number" in row:
            new["number"] = f"{row['number']}-{number}"
        if "device_id" in row:
            new["device_id"] = None
        return {**row, **new}

    @staticmethod
    def _id(old: Any, number: int) -> str:
        return str(uuid5(NAMESPACE_OID, f"{old} {number}"))

    @staticmethod
    def _sign(rows: Rows) -> None:
        snapshots = {one["id"]: one["snapshot_digest"] for one in rows[Evaluation]}
        for one in rows[Signature]:
            ink = [SimpleNamespace(**e) for e in rows[Entry] if e["sheet_id"] == one["sheet_id"]]
            kept: Any = SimpleNamespace(id=one["sheet_id"], entries=ink)
            signature: Any = SimpleNamespace(**one)
            one["signed_digest"] = digest_to_sign(signature, kept, snapshots[one["evaluation_id"]])

    def _act(self, row: dict[str, Any], number: int, rows: Rows) -> dict[str, Any]:
        new = self._renamed(row, number)
        body = json.loads(row["body"])
        self._seq += 1
        for line in body.get("entries", ()):
            line |= {name: self._id(line[name], number) for name in ("id", "strikes") if line[name]}
            entry = next(one for one in rows[Entry] if one["id"] == line["id"])
            line["digest"] = entry_digest(SimpleNamespace(**entry))
        for name in ("evaluation", "signature", "replaces"):
            if body.get(name):
                body[name] = self._id(body[name], number)
        if "signature" in body:
            signed = {one["id"]: one["signed_digest"] for one in rows[Signature]}
            body["signed_digest"] = signed[body["signature"]]
        if "certificate" in body:
            body["certificate"] = f"{body['certificate']}-{number}"
        if row["kind"] == "certificate":
            # the act before this one is the second signature, and before that stands the anchor
            seq = self._seq - 2
            certificate = next(one for one in rows[Certificate] if one["id"] == new["thing_id"])
            certificate |= {"trail_seq": seq, "trail_hash": self._hashes[seq]}
            body["trail_seq"] = seq
        new |= {"seq": self._seq, "body": canonical(body), "previous_hash": self._hash}
        new["thing_name"] = f"{row['thing_name']}-{number}"
        self._hash = self._hashes[self._seq] = trail.hash_of(SimpleNamespace(**new))
        return {**new, "hash": self._hash}


def fill(path: Path, copies: int) -> Transactions:
    """Return the demonstration with so many copies of its sheets."""
    database = open_database(sqlite_url(path))
    migrate(database)
    transactions = Transactions(database)
    now = datetime(2026, 12, 1, 13, 5, tzinfo=UTC)
    fill_demo(transactions, now=now, zone="Europe/Zurich", progress=lambda _: None)
    with database.engine.connect() as connection, connection.begin():
        # the rule of the second person searches the sheet's entries at every signature
        connection.exec_driver_sql("DROP TRIGGER IF EXISTS signature_second_person")

    def copy(session: Session) -> None:
        made = Copies(session)
        for number in range(copies):
            made.add(number)
        made.finish()

    transactions.write(copy)
    return transactions


def records_of(session: Session, *, whole: bool) -> Iterator[bytes]:
    """Yield the bytes of every record that is read: all columns of a row, one after the other."""
    tables = (TrailRow, Certificate, Entry, Evaluation, Signature, Sheet)
    for table in tables if whole else tables[:2]:
        for row in session.execute(sa.select(*table.__table__.columns)):
            yield "\n".join(map(str, row)).encode()


def best(work: Callable[[], Any]) -> float:
    """Return the shortest of some runs, in seconds of this process: the machine is shared."""
    times = []
    for _ in range(RUNS):
        start = time.process_time()
        work()
        times.append(time.process_time() - start)
    return min(times)


def hash_all(records: list[bytes]) -> None:
    """Make one digest of each record."""
    for one in records:
        hashlib.sha256(one).hexdigest()


def main() -> None:
    """Print the table; end with 1 where the record does not hold or the figure is missed."""
    copies = int(sys.argv[1]) if len(sys.argv) > 1 else COPIES
    with tempfile.TemporaryDirectory() as folder:
        transactions = fill(Path(folder) / "ledger.sqlite", copies)
        found = check_trail(transactions)
        lines = [found.says, f"{'':30}{'records':>9}{'MB':>8}{'SHA-256 s':>11}{'check s':>9}"]
        missed = not found.holds
        checks: dict[str, Callable[[], Any]] = {
            "chain, anchors, certificates": lambda: transactions.read(trail.check),
            "the whole record": lambda: check_trail(transactions),
        }
        for what, check in checks.items():
            whole = what == "the whole record"
            records = transactions.read(lambda s, w=whole: list(records_of(s, whole=w)))
            size = sum(map(len, records)) / 1e6
            yardstick, took = best(lambda r=records: hash_all(r)), best(check)
            ratio = took / yardstick
            line = f"{what:30}{len(records):9}{size:8.1f}{yardstick:11.3f}{took:9.3f}"
            lines.append(f"{line}   {ratio:.1f} times")
            missed |= ratio > MOST_TIMES
        transactions.close()
    print("\n".join(lines))
    raise SystemExit(1 if missed else 0)


if __name__ == "__main__":
    main()
