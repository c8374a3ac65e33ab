"""A curve as it would be written: columns, rows and volumes, before anything is kept."""

from dataclasses import dataclass, replace
from datetime import datetime
from typing import Any

from sqlalchemy.orm import Session

from server.evaluation.sheet_curves import curves_of_sheet
from server.intake.curve_columns import remembered_from
from server.intake.curve_upload import ReadCurve, SentCurve, read_sent_curve
from server.lab.actor import Actor
from server.lab.curve_entry import SLOT, write_curve_entry
from server.lab.curve_rows import same_original
from server.lab.ink import WrittenEntry
from server.lab.rig import rig_of
from server.lab.roles import Act
from server.lab.sheet_facts import PROBE, SheetFacts
from server.lab.slots import row_at
from server.records.queries.curve_columns import CurveSource, curve_source
from server.records.queries.load_sheet import load_sheet_facts
from server.records.tables.bench import Sheet
from server.sheets.curves import CurveView
from server.sheets.parts.curve_view import curve_view
from server.sheets.parts.doors import need_reader

_ENDS = 3


@dataclass(frozen=True, slots=True)
class ColumnView:
    """One column of the table: its place from 0, its name, what it was taken for, first cells."""

    at: int
    name: str
    taken_as: str
    cells: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class CurvePreview:
    """A curve as it was understood; nothing is stored.

    ``mapping`` is what to send with the entry so that the same is read again; ``says`` sentences on
    what was recognised, ``set_aside`` on rows that were not taken; ``first`` and ``last`` points as
    they will stand; ``same_as`` the replicate whose curve is of the same file; ``curve`` every
    method's volume and the pictures.
    """

    replicate: int
    text: str
    kind: str
    points: int
    timed: bool
    file_name: str
    size: int
    sha256: str
    mapping: dict[str, Any]
    columns: tuple[ColumnView, ...]
    says: tuple[str, ...]
    set_aside: tuple[str, ...]
    first: tuple[tuple[str, str], ...]
    last: tuple[tuple[str, str], ...]
    same_as: int | None
    curve: CurveView | None


@dataclass(frozen=True, slots=True)
class ReadForPreview:
    """A sheet read for the preview of a curve, which is not read yet."""

    facts: SheetFacts
    source: CurveSource
    replicate: int
    actor: Actor


def read_for_preview(
    session: Session, sheet_id: str, replicate: int, *, actor: Actor | None, now: datetime
) -> ReadForPreview:
    """Return what a preview needs; close the transaction before the curve is read.

    Raises:
        NotFound: there is no such sheet.
        NotAllowed: somebody who writes no entries.
        Unacceptable: the recipe has no curve in this replicate.
    """
    del now
    reader = need_reader(actor)
    reader.need(Act.WRITE)
    facts = load_sheet_facts(session, sheet_id)
    row_at(facts.recipe.document, rig_of(facts.instruments), (replicate, SLOT, 1))
    source = curve_source(session, session.get_one(Sheet, sheet_id))
    return ReadForPreview(facts, source, replicate, reader)


def curve_preview(read: ReadForPreview, sent: SentCurve, *, now: datetime) -> CurvePreview:
    """Return the preview of a curve that was sent.

    Raises:
        Unacceptable: it cannot be read; row and column are named, and ``shown["table"]`` holds what
            the table looks like.
    """
    source = read.source
    found = read_sent_curve(
        sent,
        remembered=remembered_from(source.columns) if source.columns else None,
        instrument=source.burette,
    )
    entry = found.entry
    pairs = tuple(zip(entry.volume_mL, entry.reading, strict=True))
    return CurvePreview(
        replicate=read.replicate,
        text=entry.words,
        kind=entry.kind,
        points=len(pairs),
        timed=entry.seconds is not None,
        file_name=found.original.name,
        size=len(found.original.content),
        sha256=found.original.sha256,
        mapping=dict(entry.mapping),
        columns=_columns(found),
        says=tuple(one for one in found.table.says if one not in _aside(found)),
        set_aside=_aside(found),
        first=pairs[:_ENDS],
        last=pairs[-_ENDS:],
        same_as=same_original(read.facts.entries, found.original.sha256, beside=read.replicate),
        curve=_drawn(read, found, now),
    )


def _aside(found: ReadCurve) -> tuple[str, ...]:
    return tuple(one.says for one in found.table.set_aside)


def _columns(found: ReadCurve) -> tuple[ColumnView, ...]:
    shape, mapping = found.table.shape, found.table.mapping
    taken = {
        mapping.volume: f"volume, {mapping.volume_unit}",
        mapping.reading: mapping.reading_unit,
    }
    if mapping.time is not None:
        taken[mapping.time] = f"time, {mapping.time_unit}"
    names = shape.header or ()
    return tuple(
        ColumnView(
            at=at,
            name=names[at] if at < len(names) else "",
            taken_as=taken.get(at, ""),
            cells=tuple(row[at] if at < len(row) else "" for _, row in shape.sample),
        )
        for at in range(shape.width)
    )


def _drawn(read: ReadForPreview, found: ReadCurve, now: datetime) -> CurveView | None:
    """Return the curve as the sheet would show it, were it written now."""
    facts = read.facts
    others = tuple(one for one in facts.entries if one.place != (read.replicate, SLOT, 1))
    entry = _as_if_written(read, found, now, position=len(facts.entries) + 1)
    would_be = replace(facts, entries=(*others, entry))
    for told in curves_of_sheet(would_be):
        if told.replicate == read.replicate:
            return curve_view(
                told,
                sheet_id=facts.id,
                zone=facts.laboratory.zone,
                probe=facts.instrument(PROBE),
            )
    return None


def _as_if_written(
    read: ReadForPreview, found: ReadCurve, now: datetime, *, position: int
) -> WrittenEntry:
    actor = read.actor
    return WrittenEntry(
        id="preview",
        position=position,
        replicate=read.replicate,
        slot=SLOT,
        segment=1,
        text=found.entry.words,
        unit=None,
        raw=write_curve_entry(found.entry),
        strikes=None,
        reason=None,
        person_id=actor.person_id,
        printed_name=actor.printed_name,
        initials=actor.initials,
        posted_by=actor.person_id,
        device_id=None,
        device_sequence=None,
        device_at=None,
        device_zone=None,
        received_at=now,
        late=False,
    )
