"""The trail: append-only rows, each chained to the one before by SHA-256."""

import json
from collections.abc import Generator, Iterable, Mapping
from contextlib import closing
from dataclasses import dataclass
from datetime import UTC, datetime, timedelta
from json.encoder import encode_basestring as quoted
from typing import Any, NamedTuple

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


class Link(NamedTuple):
    """A row of the trail as a check reads it; ``at`` in microseconds since 1970 in UTC."""

    previous_hash: str
    hash: str
    at: int
    act: str
    body: str
    kind: str
    person_id: str | None
    person_name: str
    seq: int
    thing_id: str
    thing_name: str
    why: str | None
    zone: str


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


def hash_of(row: Any) -> str:
    """Return the hash that a row must carry: SHA-256 over the previous hash and all it says."""
    said = (getattr(row, name) for name in Link._fields[3:])
    return _hash_said(row.previous_hash, row.at.isoformat(), *said)


def _hash_said(  # noqa: PLR0913, PLR0917 - the columns of a row
    previous_hash: str, at: str, act: str, body: str, kind: str, person_id: str | None,
    person_name: str, seq: int, thing_id: str, thing_name: str, why: str | None, zone: str,
) -> str:  # fmt: skip
    """Return the hash of what a row says.

    What is hashed is the canonical text of the columns by name, spelled out here: a check makes it
    for every row there is, and a general writer of JSON would take most of its time.
    """
    person = "null" if person_id is None else quoted(person_id)
    reason = "null" if why is None else quoted(why)
    return digest(
        f'{previous_hash}\n{{"act":{quoted(act)},"at":"{at}","body":{quoted(body)},'
        f'"kind":{quoted(kind)},"person_id":{person},"person_name":{quoted(person_name)},'
        f'"seq":{seq},"thing_id":{quoted(thing_id)},"thing_name":{quoted(thing_name)},'
        f'"why":{reason},"zone":{quoted(zone)}}}'
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
) -> Generator[Link, None, None]:
    """Yield the rows in order, each once it is found to hold.

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
            if seq in anchors or seq in known:
                _check_anchors(anchors.pop(seq, ()), known.pop(seq, last_hash), (seq, last_hash))
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


def _check_anchors(
    certificates: Iterable[tuple[str, str]], kept: str, row: tuple[int, str]
) -> None:
    seq, row_hash = row
    for number, anchor in certificates:
        if anchor != row_hash:
            says = f"Certificate {number} is anchored to another row {seq}."
            raise DoesNotHold(says)
    if kept != row_hash:
        says = f"Row {seq} is not the one whose hash was kept elsewhere."
        raise DoesNotHold(says)


def _rows(session: Session, after: int) -> Generator[Link, None, None]:
    columns = {name: getattr(TrailRow, name) for name in Link._fields}
    columns["at"] = type_coerce(TrailRow.at, BigInteger)
    rows = select(*columns.values())
    ordered = rows.where(TrailRow.seq > after).order_by(TrailRow.seq)
    with closing(fetched(session, ordered, f"A row of the trail after row {after}")) as found:
        yield from map(Link._make, found)


def fetched(session: Session, rows: Executable, what: str) -> Generator[Any, None, None]:
    """Yield rows a batch at a time.

    Raises:
        DoesNotHold: one of them is no longer text that can be read; ``what`` begins the sentence.
    """
    try:
        with session.connection().execute(rows, execution_options=_STREAMED) as result:
            for rows_at_once in result.partitions():
                yield from rows_at_once
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


def _problem_of(row: Link, before: int, last_hash: str) -> str | None:
    if row.seq != before + 1:
        return f"Row {before + 1} is missing."
    if row.previous_hash != last_hash:
        return f"Row {row.seq} does not follow from row {before}."
    try:
        at = (_EPOCH + timedelta(microseconds=row.at)).isoformat()
        held = row.hash == _hash_said(last_hash, at, *row[3:])
    except (TypeError, ValueError, OverflowError):
        held = False
    return None if held else f"Row {row.seq} was changed after it was written."


def _head_seq(session: Session) -> int:
    return session.scalar(select(TrailHead.seq).where(TrailHead.id == 1)) or 0


def _hash_at(session: Session, seq: int) -> str:
    return session.scalar(select(TrailRow.hash).where(TrailRow.seq == seq)) or GENESIS
