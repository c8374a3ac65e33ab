"""The form of a calibration done here, and what a run comes to while it is done."""

from collections.abc import Mapping
from dataclasses import dataclass
from datetime import datetime
from decimal import Decimal
from typing import Any

from sqlalchemy.orm import Session

from server.lab.actor import Actor
from server.lab.calibration.preview import Preview, preview_run
from server.lab.calibration.run import KINDS, WARE_OF_KIND, UsedInstrument
from server.lab.in_use import judge, off_limits
from server.lab.refusal import NotAllowed
from server.lab.roles import Act
from server.lab.sheet_facts import BALANCE, BURETTE, PROBE, ROOM, THERMOMETER
from server.lab.states import IN_DATE
from server.lab.validity import local_day
from server.metrology.conformity import RULES
from server.records.queries.list_stores import (
    CHECK_SPAN,
    ListedInstrument,
    calibrations_of,
    listed_instruments,
)
from server.records.queries.load_used import used_for_run
from server.sheets.bench import Choice
from server.sheets.instruments import RunForm, RunPreview
from server.sheets.instruments_page import buffers_by_set, find_instrument
from server.sheets.parts.calibration_views import judged_views, told_view
from server.sheets.parts.doors import need_reader
from server.sheets.parts.telling import last_day_words


@dataclass(frozen=True, slots=True)
class AskedRun:
    """A run as it stands in the form; ``picked`` holds ids of what it is weighed with, by kind."""

    instrument_id: str
    run: Mapping[str, Any]
    picked: Mapping[str, str]


@dataclass(frozen=True, slots=True)
class ReadRun:
    """A run read for its preview, not judged yet."""

    kind: str
    name: str
    typed: Mapping[str, Any]
    used: tuple[UsedInstrument, ...]


def open_run_form(
    session: Session, instrument_id: str, *, actor: Actor | None, now: datetime
) -> RunForm:
    """Return the form of a calibration of an instrument.

    Raises:
        NotFound: there is no such instrument.
        NotSignedIn: a visitor.
        NotAllowed: somebody who does not keep instruments, or a kind that is calibrated elsewhere.
    """
    reader = need_reader(actor)
    reader.need(Act.KEEP)
    return _form(session, instrument_id, reader, now)


def open_drop_form(
    session: Session, instrument_id: str, *, actor: Actor | None, now: datetime
) -> RunForm:
    """Return the form by which a burette's drops are weighed.

    Raises:
        NotFound: there is no such instrument.
        NotSignedIn: a visitor.
        NotAllowed: somebody who writes no logs, or an instrument that gives no drops.
    """
    reader = need_reader(actor)
    reader.need(Act.LOG)
    if find_instrument(session, instrument_id).kind != BURETTE:
        raise NotAllowed("Only a burette gives drops.", field="instrument_id")
    return _form(session, instrument_id, reader, now)


def _form(session: Session, instrument_id: str, reader: Actor, now: datetime) -> RunForm:
    row = find_instrument(session, instrument_id)
    if row.kind not in KINDS:
        says = f"A {row.kind} is calibrated elsewhere: record its certificate."
        raise NotAllowed(says, field="instrument_id")
    ware = row.kind in WARE_OF_KIND
    listed = listed_instruments(session, since=now - CHECK_SPAN) if ware else []
    kept = calibrations_of(session, row.id)

    def choices(kind: str) -> tuple[Choice, ...]:
        found = (_choice(one, now, reader.zone) for one in listed if one.instrument.kind == kind)
        return tuple(sorted(found, key=lambda one: one.refused is not None))

    return RunForm(
        id=row.id,
        kind=row.kind,
        name=row.name,
        capacity=str(row.document.get("capacity") or ""),
        resolution=str(row.document.get("resolution") or ""),
        wares=WARE_OF_KIND.get(row.kind, ()),
        points=_points(str(row.document.get("capacity") or "")) if row.kind == BURETTE else (),
        rules=tuple(RULES.items()),
        buffers=buffers_by_set() if row.kind == PROBE else (),
        balances=choices(BALANCE),
        thermometers=choices(THERMOMETER),
        rooms=choices(ROOM),
        today=local_day(now, reader.zone).isoformat(),
        next_version=kept[0].row.version + 1 if kept else 1,
    )


def read_run(session: Session, asked: AskedRun, *, actor: Actor | None, now: datetime) -> ReadRun:
    """Return what a preview is made of; close the transaction before judging it.

    Raises:
        NotFound: there is no such instrument.
        NotSignedIn: a visitor.
        NotAllowed: somebody who does not keep instruments.
        Unacceptable: an instrument for the weighing that is not in date.
    """
    reader = need_reader(actor)
    reader.need(Act.KEEP)
    row = find_instrument(session, asked.instrument_id)
    used = used_for_run(session, row.kind, asked.picked, now=now, zone=reader.zone)
    return ReadRun(row.kind, row.name, asked.run, used)


def judge_preview(read: ReadRun) -> RunPreview:
    """Return what a run comes to so far."""
    found = preview_run(read.kind, read.typed, read.used)
    return RunPreview(
        volumes={place: f"{volume:.5f}" for place, volume in found.volumes.items()},
        unfinished=found.unfinished,
        run=_view(read, found),
        says=found.says,
        field=found.field,
    )


def _view(read: ReadRun, found: Preview) -> Any:
    if found.judged is None:
        return None
    return told_view(
        read.name,
        found.judged.told,
        judged_views(found.judged.checks),
        verdict=found.judged.verdict,
        used=[one.to_document() for one in read.used],
    )


def _points(capacity: str) -> tuple[str, ...]:
    """Return five readings evenly over a burette, each weighed twice."""
    if not capacity:
        return ()
    fifth = Decimal(capacity) / 5
    return tuple(f"{(fifth * n).normalize():f}" for n in range(1, 6) for _ in range(2))


def _choice(one: ListedInstrument, now: datetime, zone: str) -> Choice:
    row, fact = one.instrument, one.fact
    if fact is None:
        return Choice(row.id, row.name, "", "It has no calibration yet.")
    state, says = judge(
        fact.name, due_at=fact.due_at, basis=fact.due_basis, holds=fact.holds,
        used_at=now, zone=zone, what="calibration",
    )  # fmt: skip
    about = f"calibrated until {last_day_words(fact.due_at, zone)}"
    stopped = off_limits(fact, at=now, zone=zone)
    refused = says if state != IN_DATE else stopped
    return Choice(row.id, row.name, about, refused or None)
