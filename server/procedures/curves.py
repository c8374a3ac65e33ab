"""A curve on its way to its row: read as its instrument wrote it, its original kept."""

from collections.abc import Mapping
from dataclasses import dataclass, field
from datetime import datetime
from types import MappingProxyType

from sqlalchemy.orm import Session

from server.intake.curve_columns import remembered_from
from server.intake.curve_upload import ReadCurve, SentCurve, read_sent_curve
from server.lab.actor import Actor
from server.lab.curve_rows import same_original
from server.lab.ink import WrittenEntry
from server.lab.refusal import NotFound, Unacceptable
from server.procedures.files import keep_file
from server.records.queries.curve_columns import CurveSource, curve_source, remember_columns
from server.records.tables.bench import Sheet

_TWICE = "same file as before, confirmed"


@dataclass(frozen=True, slots=True)
class CurvesRead:
    """Curves that were read before the write began: by the id of their entry, and whose they are.

    Reading a large file takes a second; nothing is held open meanwhile.
    """

    source: CurveSource
    by_entry: Mapping[str, ReadCurve] = field(default_factory=lambda: MappingProxyType({}))


def find_curve_source(
    session: Session, sheet_id: str, *, actor: Actor | None = None, now: datetime | None = None
) -> CurveSource:
    """Return whose files a sheet's curves are, and how their columns were last.

    Raises:
        NotFound: there is no such sheet.
    """
    del actor, now
    sheet = session.get(Sheet, sheet_id)
    if sheet is None:
        raise NotFound("There is no such bench sheet.", field="sheet_id")
    return curve_source(session, sheet)


def read_curve_of(sent: SentCurve, source: CurveSource) -> ReadCurve:
    """Return the curve that was sent for a sheet.

    Raises:
        Unacceptable: it cannot be read; row and column are named.
    """
    return read_sent_curve(
        sent,
        remembered=remembered_from(source.columns) if source.columns else None,
        instrument=source.burette,
    )


def check_not_twice(
    read: ReadCurve, entries: list[WrittenEntry], *, replicate: int, reason: str | None
) -> None:
    """Refuse the same file in two replicates, unless somebody says why.

    Raises:
        Unacceptable: another replicate's standing curve is of the same bytes.
    """
    other = same_original(entries, read.original.sha256, beside=replicate)
    if other is not None and not (reason or "").strip():
        says = (
            f"This file is the curve of replicate {other} already. Take this replicate's own, or "
            "give the reason why it is the same."
        )
        raise Unacceptable(says, field="reason", example=_TWICE)


def keep_curve(
    session: Session, read: ReadCurve, source: CurveSource, *, actor: Actor, now: datetime
) -> str:
    """Keep a curve's original and its columns for the next time; return the file's id."""
    remember_columns(
        session, source, read.columns.to_document(), person_id=actor.person_id, now=now
    )
    return keep_file(session, read.original, actor=actor, now=now)
