"""Rows of the trail: of one sheet, or by person, thing and day."""

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import datetime

from sqlalchemy import Select, and_, or_, select
from sqlalchemy.orm import Session

from server.records.tables.bench import Certificate
from server.records.tables.trail import TrailRow

_WORDS = (
    TrailRow.act, TrailRow.why, TrailRow.body, TrailRow.thing_name, TrailRow.kind,
    TrailRow.person_name,
)  # fmt: skip


@dataclass(frozen=True, slots=True)
class TrailFilter:
    """Which rows: the printed name, parts of the thing's kind or name, words, instants from and to.

    A word may stand anywhere in what was done, to what, by whom, why, and with which details.
    """

    person: str = ""
    thing: str = ""
    words: str = ""
    start: datetime | None = None
    end: datetime | None = None


def trail_rows(
    session: Session, wanted: TrailFilter, *, offset: int, most: int
) -> Sequence[TrailRow]:
    """Return a page of the trail's rows, the newest first."""
    ordered = _wanted(wanted).order_by(TrailRow.seq.desc()).offset(offset).limit(most)
    return session.scalars(ordered).all()


def trail_rows_forward(session: Session, wanted: TrailFilter, *, most: int) -> Sequence[TrailRow]:
    """Return the first of the trail's rows that answer, the oldest first."""
    return session.scalars(_wanted(wanted).order_by(TrailRow.seq).limit(most)).all()


def _wanted(wanted: TrailFilter) -> Select[TrailRow]:
    rows = select(TrailRow)
    if wanted.person:
        rows = rows.where(TrailRow.person_name == wanted.person)
    for word in wanted.thing.split():
        rows = rows.where(
            or_(
                TrailRow.thing_name.icontains(word, autoescape=True),
                TrailRow.kind.icontains(word, autoescape=True),
                TrailRow.thing_id == word,
            )
        )
    for word in wanted.words.split():
        rows = rows.where(or_(*(one.icontains(word, autoescape=True) for one in _WORDS)))
    if wanted.start is not None:
        rows = rows.where(TrailRow.at >= wanted.start)
    if wanted.end is not None:
        rows = rows.where(TrailRow.at < wanted.end)
    return rows


def trail_people(session: Session) -> list[str]:
    """Return the names of all who stand in the trail."""
    names = session.scalars(select(TrailRow.person_name).distinct())
    return sorted(name for name in names if name)


def trail_of_sheet(session: Session, sheet_id: str) -> Sequence[TrailRow]:
    """Return all that was done to a sheet and its certificate, the newest last."""
    issued = select(Certificate.id).where(Certificate.sheet_id == sheet_id)
    rows = select(TrailRow).where(
        or_(
            and_(TrailRow.kind == "sheet", TrailRow.thing_id == sheet_id),
            and_(TrailRow.kind == "certificate", TrailRow.thing_id.in_(issued)),
        )
    )
    return session.scalars(rows.order_by(TrailRow.seq)).all()


def issue_noted(session: Session, certificate_id: str) -> str | None:
    """Return what the trail says of the issue of a certificate, as canonical text."""
    return session.scalar(
        select(TrailRow.body)
        .where(TrailRow.kind == "certificate", TrailRow.thing_id == certificate_id)
        .order_by(TrailRow.seq)
        .limit(1)
    )
