"""What is kept of bench sheets beside what the trail noted, row by row, for checking."""

from collections import namedtuple
from collections.abc import Iterator, Sequence
from datetime import datetime
from typing import Any, NamedTuple

from sqlalchemy import ColumnElement, and_, or_, select
from sqlalchemy.orm import Session

from server.lab.integrity import KeptSheet, NotedAct
from server.records.tables.bench import Certificate, Entry, Evaluation, Sheet, Signature
from server.records.tables.lots import Bottle, Lot, Pull
from server.records.tables.stores import Hold
from server.records.tables.trail import TrailRow
from server.records.trail import fetched, read_body

USED_UP, PROPOSED, PULLED = "used up a bottle", "proposed a pull", "pulled a lot"
_named: Any = namedtuple  # noqa: PYI024 - made with a table's own columns


class Done(NamedTuple):
    """An act that changed the state of a thing, as the trail notes it and as the thing tells it."""

    act: str
    kind: str
    thing_id: str
    person_id: str | None
    at: datetime
    why: str | None


def sheet_ids(session: Session) -> list[str]:
    """Return all bench sheets by their numbers."""
    return list(session.scalars(select(Sheet.id).order_by(Sheet.number)))


def sheets_of_certificates(session: Session) -> dict[str, str]:
    """Return the sheet of each certificate, by their ids."""
    rows = session.execute(select(Certificate.id, Certificate.sheet_id))
    return {row.id: row.sheet_id for row in rows}


def load_kept_sheet(session: Session, sheet_id: str) -> KeptSheet:
    """Return all that is kept and noted of one sheet.

    Raises:
        DoesNotHold: something of it can no longer be read.
    """
    issued = select(Certificate.id).where(Certificate.sheet_id == sheet_id)
    acts = or_(
        and_(TrailRow.kind == "sheet", TrailRow.thing_id == sheet_id),
        and_(TrailRow.kind == "certificate", TrailRow.thing_id.in_(issued)),
    )
    return load_kept_sheets(session, [sheet_id], acts)[0]


def acts_in_rows(seqs: Sequence[int]) -> ColumnElement[bool]:
    """Return the condition that an act stands in one of these rows of the trail."""
    return TrailRow.seq.in_(seqs)


def load_kept_sheets(
    session: Session, wanted: Sequence[str], acts: ColumnElement[bool]
) -> list[KeptSheet]:
    """Return all that is kept of some sheets, and those of the ``acts`` that are on them.

    Raises:
        DoesNotHold: something of them can no longer be read.
    """
    rows = _by_id(session, Sheet, Sheet.id.in_(wanted))
    entries = _by_sheet(session, Entry, wanted, Entry.position)
    evaluations = _by_sheet(session, Evaluation, wanted, Evaluation.made_at)
    signatures = _by_sheet(session, Signature, wanted, Signature.at)
    certificates = _certificates(session, wanted)
    of_certificate = {one.id: key for key, found in certificates.items() for one in found}
    noted: dict[str, list[NotedAct]] = {}
    for act in list(_acts(session, acts)):
        sheet_id = act.thing_id if act.kind == "sheet" else of_certificate.get(act.thing_id)
        if sheet_id is not None:
            noted.setdefault(sheet_id, []).append(act)
    return [
        KeptSheet(
            id=one,
            row=rows.get(one),
            acts=noted.get(one, ()),
            entries=entries.get(one, ()),
            evaluations=evaluations.get(one, ()),
            signatures=signatures.get(one, ()),
            certificates=certificates.get(one, ()),
        )
        for one in wanted
    ]


def states_as_they_stand(session: Session) -> Iterator[Done]:
    """Yield each pull, hold, release and emptied bottle as the things themselves tell it.

    Raises:
        DoesNotHold: something of them can no longer be read.
    """
    for pull in fetched(session, select(*Pull.__table__.columns), "A pull"):
        lot = ("lot", pull.lot_id)
        yield Done(PROPOSED, *lot, pull.proposed_by, pull.proposed_at, pull.reason)
        if pull.confirmed_at is not None:
            yield Done(PULLED, *lot, pull.confirmed_by, pull.confirmed_at, pull.reason)
    for hold in fetched(session, select(*Hold.__table__.columns), "A hold"):
        thing = (hold.kind, hold.thing_id)
        yield Done(f"held a {hold.kind}", *thing, hold.held_by, hold.held_at, hold.reason)
        if hold.released_at is not None:
            yield Done(
                f"released a {hold.kind}", *thing, hold.released_by, hold.released_at,
                hold.release_reason,
            )  # fmt: skip
    used_up = select(Bottle.id, Bottle.used_up_by, Bottle.used_up_at)
    for one in fetched(session, used_up.where(Bottle.used_up_at.is_not(None)), "A bottle"):
        yield Done(USED_UP, "bottle", one.id, one.used_up_by, one.used_up_at, None)


def _by_id(session: Session, table: Any, where: ColumnElement[bool]) -> dict[str, Any]:
    found = select(*table.__table__.columns).where(where)
    return {one.id: one for one in fetched(session, found, f"A {table.__tablename__}")}


def _by_sheet(
    session: Session, table: Any, wanted: Sequence[str], order: Any
) -> dict[str, list[Any]]:
    rows = select(*table.__table__.columns).where(table.sheet_id.in_(wanted))
    found: dict[str, list[Any]] = {}
    ordered = rows.order_by(order, table.id)
    # every column of every row is looked at: a plain tuple's attributes are the quickest
    plain = _named(table.__tablename__, table.__table__.columns.keys())
    for row in fetched(session, ordered, f"The text of one {table.__tablename__} or more"):
        one = plain._make(row)
        found.setdefault(one.sheet_id, []).append(one)
    return found


def _certificates(session: Session, wanted: Sequence[str]) -> dict[str, list[Any]]:
    rows = select(*Certificate.__table__.columns, Lot.name.label("lot_name"))
    of_sheets = rows.outerjoin(Lot, Lot.id == Certificate.lot_id)
    ordered = of_sheets.where(Certificate.sheet_id.in_(wanted)).order_by(Certificate.number)
    found: dict[str, list[Any]] = {}
    for one in fetched(session, ordered, "The text of one certificate or more"):
        found.setdefault(one.sheet_id, []).append(one)
    return found


def _acts(session: Session, where: ColumnElement[bool]) -> Iterator[NotedAct]:
    rows = select(*TrailRow.__table__.columns).where(where).order_by(TrailRow.seq)
    for row in fetched(session, rows, "A row of the trail"):
        yield NotedAct(
            row.seq, row.at, row.person_id, row.act, row.kind, row.thing_id, row.thing_name,
            row.why, read_body(row),
        )  # fmt: skip
