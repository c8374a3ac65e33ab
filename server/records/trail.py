"""The trail: append-only rows, each chained to the one before by SHA-256."""

import json
from collections.abc import Generator, Mapping
from contextlib import closing
from dataclasses import dataclass
from datetime import UTC, datetime, timedelta
from json.encoder import encode_basestring as quoted
from typing import Any

from sqlalchemy import BigInteger, Executable, select, type_coerce
from sqlalchemy.exc import DBAPIError
from sqlalchemy.orm import Session

from server.lab.actor import Actor
from server.lab.canonical import canonical, digest
from server.lab.integrity import ISSUED
from server.records.tables.bench import Certificate
from server.records.tables.trail import TrailHead, TrailRow

#: The hash before the first row.
GENESIS = "0" * 64
SYSTEM = "Titrant Ledger"
_EPOCH = datetime(1970, 1, 1, tzinfo=UTC)
_STREAMED = {"yield_per": 500}


@dataclass(frozen=True, slots=True)
class TrailCheck:
    """Whether the chain holds, how many rows were read, and in words up to where."""

    holds: bool
    rows: int
    says: str
    seq: int
    hash: str


class DoesNotHold(Exception):
    """The first thing that does not hold, in a sentence."""

    def __init__(self, says: str) -> None:
        super().__init__(says)
        self.says = says


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


def hash_of(row: Any, *, at: str | None = None) -> str:
    """Return the hash that a row must carry: SHA-256 over the previous hash and all it says.

    ``at`` is the row's instant in ISO 8601, where the caller has it as text already. What is hashed
    is the canonical text of the row's columns by name, spelled out here: a check makes it for
    every row there is, and a general writer of JSON takes most of its time.
    """
    person = "null" if row.person_id is None else quoted(row.person_id)
    why = "null" if row.why is None else quoted(row.why)
    return digest(
        f'{row.previous_hash}\n{{"act":{quoted(row.act)},"at":"{at or row.at.isoformat()}",'
        f'"body":{quoted(row.body)},"kind":{quoted(row.kind)},"person_id":{person},'
        f'"person_name":{quoted(row.person_name)},"seq":{row.seq},'
        f'"thing_id":{quoted(row.thing_id)},"thing_name":{quoted(row.thing_name)},'
        f'"why":{why},"zone":{quoted(row.zone)}}}'
    )


def read_body(row: Any) -> dict[str, Any]:
    """Return what a row says beyond its columns.

    Raises:
        DoesNotHold: its body is not the text of an object.
    """
    try:
        body = json.loads(row.body)
    except ValueError:
        body = None
    if not isinstance(body, dict):
        raise DoesNotHold(f"What row {row.seq} says cannot be read.")
    return body


def check(session: Session, *, newest: int | None = None) -> TrailCheck:
    """Return whether rows, head, anchors and certificates' texts hold; name the first not.

    ``newest``: look at the last so many rows only, and at the certificates anchored in them.
    """
    after = 0 if newest is None else max(0, _head_seq(session) - newest)
    seq, last_hash = after, GENESIS
    issued: dict[str, str | None] = {}
    try:
        with closing(read_chain(session, after=after)) as chain:
            for row in chain:
                seq, last_hash = row.seq, row.hash
                if row.act == ISSUED:
                    issued.setdefault(row.thing_id, read_body(row).get("document_digest"))
        _check_documents(session, issued, after)
    except DoesNotHold as broken:
        return TrailCheck(False, seq - after, broken.says, seq, last_hash)
    rows = seq - after
    says = f"The chain holds over {rows} rows."
    if after:
        says = (
            f"The chain holds over its newest {rows} rows, from {after + 1} to {seq}; "
            "“trail check” on the command line reads all of them."
        )
    return TrailCheck(True, rows, says, seq, last_hash)


def read_chain(
    session: Session, *, after: int = 0, known: Mapping[int, str] | None = None
) -> Generator[Any, None, None]:
    """Yield the rows in order, each once it is found to hold: columns as stored, ``at`` as µs.

    ``known`` maps numbers of rows to the hashes that somebody kept elsewhere.

    Raises:
        DoesNotHold: a row, the head, a certificate's anchor or a known hash does not hold.
    """
    seq = after
    last_hash = _hash_at(session, after) if after else GENESIS
    anchors, known = _anchors(session, after), dict(known or {})
    with closing(_rows(session, after)) as rows:
        for row in rows:
            problem = _problem_of(row, seq, last_hash)
            if problem is not None:
                raise DoesNotHold(problem)
            seq, last_hash = row.seq, row.hash
            for number, anchor in anchors.pop(seq, ()):
                if anchor != last_hash:
                    says = f"Certificate {number} is anchored to another row {seq}."
                    raise DoesNotHold(says)
            if known.pop(seq, last_hash) != last_hash:
                says = f"Row {seq} is not the one whose hash was kept elsewhere."
                raise DoesNotHold(says)
            yield row
    standing = session.get(TrailHead, 1)
    if standing is None or (standing.seq, standing.hash) != (seq, last_hash):
        says = f"The chain ends at row {seq}, but its head says otherwise: rows are missing."
        raise DoesNotHold(says)
    for certificates in anchors.values():
        says = f"Certificate {certificates[0][0]} is anchored to a row that is not there."
        raise DoesNotHold(says)
    for missing in known:
        says = f"The chain ends at row {seq}; row {missing}, whose hash was kept, is not there."
        raise DoesNotHold(says)


def _rows(session: Session, after: int) -> Generator[Any, None, None]:
    columns = [one for one in TrailRow.__table__.columns if one.name != "at"]
    rows = select(type_coerce(TrailRow.at, BigInteger).label("at"), *columns)
    ordered = rows.where(TrailRow.seq > after).order_by(TrailRow.seq)
    yield from fetched(session, ordered, f"A row of the trail after row {after}")


def fetched(session: Session, rows: Executable, what: str) -> Generator[Any, None, None]:
    """Yield rows a batch at a time.

    Raises:
        DoesNotHold: one of them is no longer text that can be read; ``what`` begins the sentence.
    """
    try:
        with session.connection().execute(rows, execution_options=_STREAMED) as result:
            yield from result
    except (DBAPIError, ValueError, OverflowError, TypeError) as problem:
        says = f"{what} cannot be read: it is damaged."
        raise DoesNotHold(says) from problem


def _anchors(session: Session, after: int) -> dict[int, list[tuple[str, str]]]:
    """Return numbers and hashes of the certificates anchored in each row."""
    found: dict[int, list[tuple[str, str]]] = {}
    columns = select(Certificate.number, Certificate.trail_seq, Certificate.trail_hash)
    for number, seq, anchor in session.execute(columns.where(Certificate.trail_seq > after)):
        found.setdefault(seq, []).append((number, anchor))
    return found


def _check_documents(session: Session, issued: Mapping[str, str | None], after: int) -> None:
    """Refuse a certificate whose text is not the one that the trail says was issued."""
    rows = select(
        Certificate.id, Certificate.number, Certificate.document, Certificate.document_digest
    )
    ordered = rows.where(Certificate.trail_seq > after).order_by(Certificate.number)
    with closing(fetched(session, ordered, "The text of a certificate")) as certificates:
        for one in certificates:
            if not digest(one.document) == one.document_digest == issued.get(one.id):
                says = f"Certificate {one.number} is not the text that was issued."
                raise DoesNotHold(says)


def _problem_of(row: Any, seq: int, last_hash: str) -> str | None:
    if row.seq != seq + 1:
        return f"Row {seq + 1} is missing."
    if row.previous_hash != last_hash:
        return f"Row {row.seq} does not follow from row {seq}."
    try:
        at = (_EPOCH + timedelta(microseconds=row.at)).isoformat()
        held = row.hash == hash_of(row, at=at)
    except (TypeError, ValueError, OverflowError):
        held = False
    return None if held else f"Row {row.seq} was changed after it was written."


def _head_seq(session: Session) -> int:
    return session.scalar(select(TrailHead.seq).where(TrailHead.id == 1)) or 0


def _hash_at(session: Session, seq: int) -> str:
    return session.scalar(select(TrailRow.hash).where(TrailRow.seq == seq)) or GENESIS
