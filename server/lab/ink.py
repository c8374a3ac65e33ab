"""Entries in ink: never changed, only struck through and written anew, with a reason."""

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from datetime import datetime
from operator import attrgetter
from typing import Any

from server.lab.canonical import canonical, digest
from server.lab.curve_entry import SLOT as CURVE

#: Reasons that the correction pad offers; a free text is as good.
CORRECTION_REASONS = (
    "slip of the pen",
    "misread",
    "written in the wrong row",
    "weighed or filled again",
)
#: The criteria by which a replicate may be left out of the mean; a reason is given besides.
EXCLUSION_CRITERIA = (
    "titrated past the end point",
    "spilled or lost",
    "air bubble in the burette",
    "wrong mass or volume taken",
    "outlier by Grubbs at 1 %",
    "other, set by the laboratory beforehand",
)
#: What is written in the row to let an excluded replicate count again.
COUNTS_AGAIN = "counts again"

Place = tuple[int, str, int]


@dataclass(frozen=True, slots=True)
class WrittenEntry:
    """One entry as it stands in the record; an empty ``text`` only strikes another.

    ``raw`` is the line that an instrument sent, or a curve as ``server.lab.curve_entry`` reads it;
    ``file_id`` the original that the curve came from.
    """

    id: str
    position: int
    replicate: int
    slot: str
    segment: int
    text: str
    unit: str | None
    raw: str | None
    strikes: str | None
    reason: str | None
    person_id: str
    printed_name: str
    initials: str
    posted_by: str
    device_id: str | None
    device_sequence: int | None
    device_at: datetime | None
    device_zone: str | None
    received_at: datetime
    late: bool
    file_id: str | None = None

    @property
    def place(self) -> Place:
        """Replicate (0 is the sheet), slot and segment."""
        return self.replicate, self.slot, self.segment


def standing(entries: Iterable[WrittenEntry]) -> dict[Place, WrittenEntry]:
    """Return what counts: for each place its last entry that is not struck through."""
    ordered = sorted(entries, key=lambda entry: entry.position)
    struck = {entry.strikes for entry in ordered if entry.strikes}
    return {
        entry.place: entry for entry in ordered if entry.id not in struck and entry.text.strip()
    }


def history(entries: Iterable[WrittenEntry], place: Place) -> tuple[WrittenEntry, ...]:
    """Return all that was ever written in a place, oldest first."""
    return tuple(sorted((e for e in entries if e.place == place), key=lambda e: e.position))


@dataclass(frozen=True, slots=True)
class Strike:
    """An entry struck through and the entry that struck it."""

    struck: WrittenEntry
    by: WrittenEntry


def strikes(entries: Sequence[WrittenEntry]) -> tuple[Strike, ...]:
    """Return every strike-through in the order in which they were made."""
    by_id = {entry.id: entry for entry in entries}
    ordered = sorted(entries, key=lambda entry: entry.position)
    return tuple(Strike(by_id[e.strikes], e) for e in ordered if e.strikes in by_id)


def excluded(entries: Iterable[WrittenEntry]) -> dict[int, WrittenEntry]:
    """Return the entry that leaves a replicate out of the mean, by replicate."""
    return {
        replicate: entry
        for (replicate, slot, _), entry in standing(entries).items()
        if slot == "excluded" and entry.text != COUNTS_AGAIN
    }


#: What an entry's digest is made of, in this order. A column that comes later needs a digest of
#: another name: what the trail noted must stay checkable.
_DIGESTED = attrgetter(
    "id", "sheet_id", "position", "replicate", "slot", "segment", "text", "unit", "raw", "strikes",
    "reason", "person_id", "posted_by", "device_id", "device_sequence", "device_zone",
    "monotonic_ms", "base_revision", "body_digest", "late", "file_id",
)  # fmt: skip


def entry_digest(entry: Any) -> str:
    """Return the digest of all that is kept of an entry's row, instants in ISO 8601 in UTC."""
    device_at = entry.device_at and entry.device_at.isoformat()
    return digest(canonical([*_DIGESTED(entry), device_at, entry.received_at.isoformat()]))


def ink_digest(entries: Iterable[WrittenEntry]) -> str:
    """Return the digest of all that was written, what is struck through included."""
    ordered = sorted(entries, key=lambda entry: entry.position)
    return digest(canonical([_line(entry) for entry in ordered]))


_LINE = attrgetter(
    "id", "position", "replicate", "slot", "segment", "text", "unit", "strikes", "reason",
    "person_id",
)  # fmt: skip


def _line(e: WrittenEntry) -> list[object]:
    line = _LINE(e)
    # a curve's words are not the curve: what was measured are its points
    return [*line, e.raw] if e.slot == CURVE else [*line]
