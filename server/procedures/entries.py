"""Writing entries: the one door, in ink."""

from dataclasses import dataclass, replace
from datetime import datetime
from typing import Any

from sqlalchemy.orm import Session

from server.lab.actor import Actor
from server.lab.curve_entry import write_curve_entry
from server.lab.device_clock import CLOCK_OFF, MOST_SKEW_S, is_late, read_instant
from server.lab.in_use import kind_of_slot, things_in_use
from server.lab.ink import WrittenEntry, entry_digest, standing
from server.lab.readings import Beside, check_reading
from server.lab.refusal import NotAllowed, SavedFirst, Unacceptable
from server.lab.rig import rig_of
from server.lab.roles import Act
from server.lab.sheet_facts import SheetFacts
from server.lab.slots import CURVE_KIND, Row, row_at
from server.lab.states import OPEN, SENT_BACK
from server.procedures.acts import Thing, note_act
from server.procedures.bench import lock_sheet
from server.procedures.curves import (
    CurvesRead,
    check_not_twice,
    keep_curve,
    read_curve_of,
)
from server.procedures.new_entries import (
    EXAMPLE_CURVE,
    NewEntry,
    Written,
    body_digest,
    check_key,
    instant_of,
)
from server.records.queries.curve_columns import CurveSource, curve_source
from server.records.queries.load_entries import entry_of_device
from server.records.queries.load_sheet import load_sheet_facts
from server.records.tables.bench import Entry, Sheet
from server.records.tables.people import Device

MOST_ENTRIES = 500


@dataclass(frozen=True, slots=True)
class WriteEntries:
    """Entries for one sheet, in the order in which they were written; all or none are taken.

    ``curves`` are those of the entries that were read already. ``sent_at`` is what the device's
    clock showed when it sent them: by it the server knows how wrong that clock is.
    """

    sheet_id: str
    entries: tuple[NewEntry, ...]
    curves: CurvesRead | None = None
    sent_at: str | None = None


def read_curves(command: WriteEntries, source: CurveSource) -> WriteEntries:
    """Return the command with its curves read, so that nothing waits for that.

    Raises:
        Unacceptable: a curve cannot be read; row and column are named.
    """
    read = {
        entry.id: read_curve_of(entry.curve, source)
        for entry in command.entries
        if entry.curve is not None
    }
    return replace(command, curves=CurvesRead(source, read))


def write_entries(
    session: Session, command: WriteEntries, *, actor: Actor, now: datetime
) -> tuple[Written, ...]:
    """Write entries on a sheet; a repeated one gets its first answer and writes nothing.

    Raises:
        KeyMissing: an entry has no UUID.
        SavedFirst: somebody else wrote in the row first; both values are shown.
        Unacceptable: a reading that cannot be, or a UUID that came before with another content.
    """
    actor.need(Act.WRITE)
    if not 1 <= len(command.entries) <= MOST_ENTRIES:
        says = f"Send 1 to {MOST_ENTRIES} entries at a time."
        raise Unacceptable(says, field="entries")
    for entry in command.entries:
        check_key(entry)
    sheet = lock_sheet(session, command.sheet_id)
    answers = [_earlier(session, sheet, entry) for entry in command.entries]
    if all(answers):
        return tuple(answer for answer in answers if answer)
    facts = load_sheet_facts(session, sheet.id)
    _need_writable(facts)
    curves = command.curves or CurvesRead(curve_source(session, sheet))
    pen = _Pen(session, sheet, facts, curves=curves, sent_at=command.sent_at, actor=actor, now=now)
    written = tuple(
        answer or pen.write(entry) for answer, entry in zip(answers, command.entries, strict=True)
    )
    pen.finish()
    return written


def _earlier(session: Session, sheet: Sheet, entry: NewEntry) -> Written | None:
    """Return the first answer where this entry came before."""
    row = session.get(Entry, entry.id)
    if row is None:
        return None
    if row.body_digest != body_digest(sheet.id, entry):
        says = "This entry's UUID came before with something else in it; nothing was written now."
        raise Unacceptable(says, field="id")
    return Written(row.id, row.position, repeated=True)


def _need_writable(facts: SheetFacts) -> None:
    if facts.state not in {OPEN, SENT_BACK}:
        says = f"This sheet is {facts.state}: nothing is written on it any more."
        if facts.state == "handed in":
            says += " A countersigner can send it back."
        raise NotAllowed(says)
    if facts.lot.pulled:
        raise NotAllowed("This lot was pulled: it is out of use for good.")


@dataclass(frozen=True, slots=True)
class _CurveKept:
    """What a curve's entry holds in place of what was typed."""

    text: str
    raw: str
    file_id: str
    sha256: str


class _Pen:
    """Writes entries one by one, each checked against what stands by then."""

    def __init__(
        self,
        session: Session,
        sheet: Sheet,
        facts: SheetFacts,
        *,
        curves: CurvesRead,
        sent_at: str | None,
        actor: Actor,
        now: datetime,
    ) -> None:
        self._session, self._sheet, self._facts = session, sheet, facts
        self._curves, self._actor, self._now = curves, actor, now
        self._rig = rig_of(facts.instruments)
        self._entries = list(facts.entries)
        self._refused = {one.kind: one for one in things_in_use(facts, at=now) if one.blocks}
        self._lines: list[dict[str, Any]] = []
        sent = read_instant(sent_at, "sent_at")
        self._skew_s = round((sent - now).total_seconds()) if sent else None

    def write(self, entry: NewEntry) -> Written:
        """Check one entry and write it."""
        if entry.id in {one.id for one in self._entries}:
            raise Unacceptable("Two entries in this list have the same UUID.", field="id")
        row = row_at(
            self._facts.recipe.document, self._rig, (entry.replicate, entry.slot, entry.segment)
        )
        self._check_in_date(entry, row.label)
        stands = standing(self._entries)
        self._check_strike(entry, stands.get(row.place), row.label)
        if row.kind == CURVE_KIND:
            return self._write_curve(entry, row)
        if entry.curve is not None:
            says = f"{row.label} takes no curve."
            raise Unacceptable(says, field="curve")
        if entry.text.strip() or not entry.strikes:
            values = {place: one.text for place, one in stands.items() if place != row.place}
            beside = Beside(values=values, rig=self._rig, reason=entry.reason)
            check_reading(row, entry.text, entry.unit, beside)
        return self._add(entry, row.unit)

    def _write_curve(self, entry: NewEntry, row: Row) -> Written:
        """Read a curve, keep its original, and write its points; an empty entry only strikes."""
        if entry.raw is not None:
            says = f"{row.label}: send the original in curve; its points are read here."
            raise Unacceptable(says, field="raw")
        if entry.curve is None:
            if entry.strikes and not entry.text.strip():
                return self._add(entry, row.unit)
            says = f"{row.label} takes a file or pasted text, in curve; not words alone."
            raise Unacceptable(says, field="curve", example=EXAMPLE_CURVE)
        read = self._curves.by_entry.get(entry.id)
        if read is None:
            read = read_curve_of(entry.curve, self._curves.source)
        check_not_twice(read, self._entries, replicate=entry.replicate, reason=entry.reason)
        told = _CurveKept(
            text=read.entry.words,
            raw=write_curve_entry(read.entry),
            file_id=keep_curve(
                self._session, read, self._curves.source, actor=self._actor, now=self._now
            ),
            sha256=read.original.sha256,
        )
        return self._add(entry, row.unit, told)

    def finish(self) -> None:
        """Note what was written, and take up a sheet that was sent back."""
        if self._sheet.sent_back_at is not None:
            self._sheet.sent_back_at = None
            self._sheet.handed_in_at = None
        self._sheet.revision += 1
        self._session.flush()
        struck = any(line["strikes"] for line in self._lines)
        reasons = [line["reason"] for line in self._lines if line["strikes"] and line["reason"]]
        note_act(
            self._session,
            "corrected entries" if struck else "wrote entries",
            Thing("sheet", self._sheet.id, self._sheet.number),
            actor=self._actor,
            now=self._now,
            why="; ".join(dict.fromkeys(reasons)) or None,
            body={"entries": self._lines, **self._clock()},
        )

    def _clock(self) -> dict[str, int]:
        """Return how wrong the device's clock is, where it is too wrong to be trusted."""
        off = self._skew_s is not None and abs(self._skew_s) > MOST_SKEW_S
        return {CLOCK_OFF: self._skew_s} if off and self._skew_s is not None else {}

    def _check_in_date(self, entry: NewEntry, label: str) -> None:
        for kind in kind_of_slot(entry.slot):
            if kind in self._refused:
                says = f"{self._refused[kind].says} A keeper may let it be used with a reason."
                raise Unacceptable(says, field=label)

    def _check_strike(self, entry: NewEntry, stands: WrittenEntry | None, label: str) -> None:
        if entry.strikes is None:
            if stands is not None:
                raise self._saved_first(entry, stands, label)
            return
        struck = next((one for one in self._entries if one.id == entry.strikes), None)
        if struck is None or struck.place != (entry.replicate, entry.slot, entry.segment):
            says = f"{label}: the entry to be struck is not in this row."
            raise Unacceptable(says, field="strikes")
        if stands is None or stands.id != struck.id:
            raise self._saved_first(entry, stands, label)
        if not (entry.reason or "").strip():
            says = f"{label}: give the reason why {struck.text} is struck through."
            raise Unacceptable(says, field="reason", example="misread")

    def _saved_first(self, entry: NewEntry, stands: WrittenEntry | None, label: str) -> SavedFirst:
        yours = {"text": entry.text, "unit": entry.unit, "by": self._actor.printed_name}
        theirs = stands and {
            "id": stands.id,
            "text": stands.text,
            "unit": stands.unit,
            "by": stands.printed_name,
            "at": stands.received_at.isoformat(),
        }
        says = (
            f"{label}: {theirs['by']} wrote {theirs['text']} here first. Strike it through "
            "with a reason to write anew."
            if theirs
            else f"{label}: this entry is struck through already."
        )
        return SavedFirst(says, field=label, shown={"standing": theirs, "yours": yours})

    def _add(self, entry: NewEntry, unit: str | None, curve: "_CurveKept | None" = None) -> Written:
        self._check_device(entry)
        position = len(self._entries) + 1
        device_at = instant_of(entry)
        row = Entry(
            id=entry.id,
            sheet_id=self._sheet.id,
            position=position,
            replicate=entry.replicate,
            slot=entry.slot,
            segment=entry.segment,
            text=curve.text if curve else entry.text,
            unit=unit,
            raw=curve.raw if curve else entry.raw,
            strikes=entry.strikes,
            reason=(entry.reason or "").strip() or None,
            person_id=self._actor.person_id,
            posted_by=self._actor.person_id,
            device_id=entry.device_id,
            device_sequence=entry.device_sequence if entry.device_id else None,
            device_at=device_at,
            device_zone=entry.device_zone,
            monotonic_ms=entry.monotonic_ms,
            received_at=self._now,
            base_revision=entry.base_revision,
            body_digest=body_digest(self._sheet.id, entry),
            late=is_late(device_at, self._now, skew_s=self._skew_s),
            file_id=curve.file_id if curve else None,
        )
        self._session.add(row)
        self._session.flush()
        self._entries.append(self._as_written(row))
        original = {"original_sha256": curve.sha256} if curve else {}
        self._lines.append(
            {
                "id": row.id,
                "position": position,
                "replicate": row.replicate,
                "slot": row.slot,
                "segment": row.segment,
                "text": row.text,
                "unit": row.unit,
                "strikes": row.strikes,
                "reason": row.reason,
                "digest": entry_digest(row),
                **original,
            }
        )
        return Written(row.id, position, repeated=False)

    def _check_device(self, entry: NewEntry) -> None:
        if entry.device_id is None:
            return
        if self._session.get(Device, entry.device_id) is None:
            self._session.add(Device(id=entry.device_id, name="", first_seen_at=self._now))
            self._session.flush()
        if entry.device_sequence is not None and entry_of_device(
            self._session, entry.device_id, entry.device_sequence
        ):
            says = "This device has sent another entry with the same sequence number."
            raise Unacceptable(says, field="device_sequence")

    def _as_written(self, row: Entry) -> WrittenEntry:
        return WrittenEntry(
            id=row.id,
            position=row.position,
            replicate=row.replicate,
            slot=row.slot,
            segment=row.segment,
            text=row.text,
            unit=row.unit,
            raw=row.raw,
            strikes=row.strikes,
            reason=row.reason,
            person_id=row.person_id,
            printed_name=self._actor.printed_name,
            initials=self._actor.initials,
            posted_by=row.posted_by,
            device_id=row.device_id,
            device_sequence=row.device_sequence,
            device_at=row.device_at,
            device_zone=row.device_zone,
            received_at=row.received_at,
            late=row.late,
            file_id=row.file_id,
        )
