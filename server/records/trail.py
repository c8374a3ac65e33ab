"""The trail: append-only rows, each chained to the one before by SHA-256."""

import json
from collections.abc import Mapping
from dataclasses import dataclass
from datetime import datetime
from typing import Any

from sqlalchemy import select
from sqlalchemy.orm import Session

from server.lab.actor import Actor
from server.lab.canonical import canonical, digest
from server.records.tables.bench import Certificate
from server.records.tables.trail import TrailHead, TrailRow

#: The hash before the first row.
GENESIS = "0" * 64
SYSTEM = "Titrant Ledger"


@dataclass(frozen=True, slots=True)
class TrailCheck:
    """Whether the chain holds, how many rows were read, and in words up to where."""

    holds: bool
    rows: int
    says: str
    seq: int
    hash: str


def note(  # noqa: PLR0913 - who, what, to what, why, when: a trail row has so many parts
    session: Session,
    *,
    actor: Actor | None,
    act: str,
    kind: str,
    thing_id: str,
    thing_name: str,
    why: str | None,
    body: Mapping[str, Any],
    now: datetime,
    zone: str,
) -> None:
    """Append an act to the trail; the head's row stays locked until the commit."""
    session.flush()
    last = session.get_one(TrailHead, 1, with_for_update=True, populate_existing=True)
    row = TrailRow(
        seq=last.seq + 1,
        at=now,
        zone=zone,
        person_id=actor.person_id if actor else None,
        person_name=actor.printed_name if actor else SYSTEM,
        act=act,
        kind=kind,
        thing_id=thing_id,
        thing_name=thing_name,
        why=why,
        body=canonical(dict(body)),
        previous_hash=last.hash,
        hash="",
    )
    row.hash = hash_of(row)
    session.add(row)
    last.seq, last.hash = row.seq, row.hash
    session.flush()


def head(session: Session) -> tuple[int, str]:
    """Return number and hash of the last row; 0 and zeros where there is none."""
    last = session.get_one(TrailHead, 1)
    return last.seq, last.hash


def hash_of(row: TrailRow) -> str:
    """Return the hash that a row must carry: SHA-256 over the previous hash and all it says."""
    said = {
        "seq": row.seq,
        "at": row.at.isoformat(),
        "zone": row.zone,
        "person_id": row.person_id,
        "person_name": row.person_name,
        "act": row.act,
        "kind": row.kind,
        "thing_id": row.thing_id,
        "thing_name": row.thing_name,
        "why": row.why,
        "body": row.body,
    }
    return digest(f"{row.previous_hash}\n{canonical(said)}")


def check(session: Session) -> TrailCheck:
    """Return whether every row, the head and the certificates' anchors hold; name the first not."""
    seq, last_hash = 0, GENESIS
    issued: dict[str, str | None] = {}
    anchors = _anchors(session)
    rows = session.scalars(select(TrailRow).order_by(TrailRow.seq).execution_options(yield_per=500))
    for row in rows:
        problem = _problem_of(row, seq, last_hash)
        if problem is not None:
            return TrailCheck(False, seq, problem, seq, last_hash)
        seq, last_hash = row.seq, row.hash
        if row.kind == "certificate":
            issued[row.thing_id] = json.loads(row.body).get("document_digest")
        for certificate in anchors.pop(seq, []):
            if certificate.trail_hash != last_hash:
                says = f"Certificate {certificate.number} is anchored to another row {seq}."
                return TrailCheck(False, seq, says, seq, last_hash)
    standing = session.get(TrailHead, 1)
    if standing is None or (standing.seq, standing.hash) != (seq, last_hash):
        says = f"The chain ends at row {seq}, but its head says otherwise: rows are missing."
        return TrailCheck(False, seq, says, seq, last_hash)
    for certificates in anchors.values():
        says = f"Certificate {certificates[0].number} is anchored to a row that is not there."
        return TrailCheck(False, seq, says, seq, last_hash)
    for certificate in session.scalars(select(Certificate).order_by(Certificate.number)):
        made_anew = digest(certificate.document)
        if not made_anew == certificate.document_digest == issued.get(certificate.id):
            says = f"Certificate {certificate.number} is not the text that was issued."
            return TrailCheck(False, seq, says, seq, last_hash)
    return TrailCheck(True, seq, f"The chain holds over {seq} rows.", seq, last_hash)


def _anchors(session: Session) -> dict[int, list[Certificate]]:
    found: dict[int, list[Certificate]] = {}
    for one in session.scalars(select(Certificate)):
        found.setdefault(one.trail_seq, []).append(one)
    return found


def _problem_of(row: TrailRow, seq: int, last_hash: str) -> str | None:
    if row.seq != seq + 1:
        return f"Row {seq + 1} is missing."
    if row.previous_hash != last_hash:
        return f"Row {row.seq} does not follow from row {seq}."
    if row.hash != hash_of(row):
        return f"Row {row.seq} was changed after it was written."
    return None
