"""The rows of a bench sheet with what was written in them, nothing hidden."""

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import asdict, replace

from server.lab.curve_entry import SLOT as CURVE
from server.lab.ink import Place, WrittenEntry, excluded, standing, strikes
from server.lab.log_lines import standing_lines
from server.lab.lot_log import DRYING, drying_of, is_drying_step, logged_words
from server.lab.rig import rig_of
from server.lab.sheet_facts import SheetFacts
from server.lab.slots import (
    MOST_REPLICATES,
    Row,
    replicate_rows,
    replicates_shown,
    row_at,
    segments_begun,
    sheet_rows,
)
from server.sheets.bench import BenchGroup, BenchRow, EntryView, NextRow, StruckEntry
from server.sheets.parts.returned import remarks_on_rows
from server.sheets.parts.telling import clock_words
from server.sheets.parts.written_when import clock_says

_AS_LOGGED = "The log of the standard lot holds its last drying: take it over where it is this one."


def groups_of(
    facts: SheetFacts, clocks_off: Mapping[str, int] | None = None
) -> tuple[BenchGroup, ...]:
    """Return all rows, the sheet's first, then replicate by replicate, with every strike.

    ``clocks_off``: by how many seconds the clock was ahead by which an entry was written.
    """
    written = _Written(facts, clocks_off or {})
    left_out = excluded(facts.entries)
    rows = _rows(facts)
    return tuple(
        BenchGroup(
            replicate=replicate,
            title=f"Replicate {replicate}" if replicate else "The whole sheet",
            excluded=_criterion(left_out.get(replicate)),
            rows=tuple(written.in_row(row) for row in rows if row.replicate == replicate),
        )
        for replicate in dict.fromkeys(row.replicate for row in rows)
    )


def next_row(groups: Sequence[BenchGroup]) -> NextRow | None:
    """Return the first required row that nothing is written in, left-out replicates aside."""
    for group in groups:
        for row in group.rows:
            if row.required and row.value is None and group.excluded is None:
                return NextRow(row.replicate, row.slot, row.segment)
    return None


class _Written:
    """What was written in each row of one sheet."""

    def __init__(self, facts: SheetFacts, clocks_off: Mapping[str, int]) -> None:
        self._zone = facts.laboratory.zone
        self._clocks_off = clocks_off
        self._remarks = remarks_on_rows(facts)
        self._standing = standing(facts.entries)
        self._dried = _last_dried(facts)
        self._struck: dict[Place, list[StruckEntry]] = {}
        for one in strikes(facts.entries):
            shown = StruckEntry(
                entry=self._view(one.struck),
                struck_by=one.by.initials,
                struck_clock=clock_words(one.by.received_at, self._zone),
                struck_at=one.by.received_at.isoformat(),
                reason=one.by.reason or "",
            )
            self._struck.setdefault(one.struck.place, []).append(shown)

    def in_row(self, row: Row) -> BenchRow:
        """Return a row with its standing value and all that was struck through in it."""
        value = self._standing.get(row.place)
        if value is None and self._dried and is_drying_step(row.slot):
            row = replace(row, choices=(self._dried,), hint=_AS_LOGGED)
        return BenchRow(
            **asdict(row),
            value=self._view(value) if value else None,
            struck=tuple(self._struck.get(row.place, ())),
            remarks=tuple(self._remarks.get(row.place, ())),
        )

    def _view(self, entry: WrittenEntry) -> EntryView:
        return EntryView(
            id=entry.id,
            text=entry.text,
            unit=entry.unit,
            raw=None if entry.slot == CURVE else entry.raw,
            initials=entry.initials,
            person=entry.printed_name,
            at=entry.received_at.isoformat(),
            clock=clock_words(entry.received_at, self._zone),
            late=entry.late,
            reason=entry.reason,
            file_url=f"/files/{entry.file_id}" if entry.file_id else None,
            clock_says=clock_says(entry, self._clocks_off.get(entry.id)),
        )


def _last_dried(facts: SheetFacts) -> str:
    """Return what the lot's log says of its last drying, empty where it says nothing."""
    lot = facts.standard_lot
    lines = standing_lines(lot.log, DRYING, as_of=facts.log_as_of) if lot else ()
    last = max(lines, key=lambda one: drying_of(one).ended_at, default=None)
    return logged_words(last, facts.laboratory.zone) if last else ""


def _rows(facts: SheetFacts) -> list[Row]:
    """Return the recipe's rows, and every other row in which something was ever written."""
    recipe, rig, entries = facts.recipe.document, rig_of(facts.instruments), facts.entries
    now = standing(entries)
    rows = list(sheet_rows(recipe, rig))
    ever = max((entry.replicate for entry in entries), default=0)
    shown = max(replicates_shown(recipe, entries), ever)
    for replicate in range(1, min(shown, MOST_REPLICATES) + 1):
        begun = segments_begun(now, replicate)
        segments = max(begun, _segments_ever(entries, replicate))
        found = replicate_rows(recipe, rig, replicate, segments=segments)
        rows += [replace(row, required=row.required and row.segment <= begun) for row in found]
    known = {row.place for row in rows}
    return [*rows, *_other_rows(facts, known)]


def _segments_ever(entries: Sequence[WrittenEntry], replicate: int) -> int:
    found = [
        entry.segment
        for entry in entries
        if entry.replicate == replicate and entry.slot in {"burette_start", "burette_end"}
    ]
    return max(found, default=1)


def _other_rows(facts: SheetFacts, known: set[Place]) -> Iterator[Row]:
    """Yield the rows of entries beside the recipe's own: remarks on a replicate."""
    recipe, rig = facts.recipe.document, rig_of(facts.instruments)
    places = [entry.place for entry in facts.entries] + list(remarks_on_rows(facts))
    for place in dict.fromkeys(places):
        if place not in known:
            yield replace(row_at(recipe, rig, place), required=False)


def _criterion(entry: WrittenEntry | None) -> str | None:
    return f"{entry.text}: {entry.reason}" if entry else None


def labels_missing(group: BenchGroup) -> tuple[str, ...]:
    """Return the labels of required rows of a group that are not written yet."""
    return tuple(row.label for row in group.rows if row.required and row.value is None)


def group_by_label(groups: Sequence[BenchGroup]) -> Mapping[str, BenchGroup]:
    """Return the replicates' groups by the label that they carry in a bench record."""
    return {str(group.replicate): group for group in groups if group.replicate}
