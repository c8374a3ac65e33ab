"""A lot's entries as CSV, a line for each thing ever written, struck through or not."""

from collections.abc import Iterable, Iterator
from datetime import datetime

from server.lab.ink import WrittenEntry
from server.reports.csv_export import write_csv
from server.reports.lot.bundle import WrittenSheet

HEADINGS = (
    "sheet", "position", "replicate", "slot", "segment", "text", "unit", "read from", "strikes",
    "struck by", "reason", "person", "posted by", "received at", "device at", "device zone", "late",
    "entry",
)  # fmt: skip
#: Where a true number may stand as one.
NUMERIC = ("position", "replicate", "segment", "text", "strikes", "struck by")


def entries_csv(sheets: Iterable[WrittenSheet]) -> bytes:
    """Return the entries of sheets; strikes are told by the positions of the entries."""
    rows = [row for sheet in sheets for row in _rows(sheet)]
    return write_csv(HEADINGS, rows, numeric=NUMERIC)


def _rows(sheet: WrittenSheet) -> Iterator[list[str]]:
    ordered = sorted(sheet.entries, key=lambda one: one.position)
    positions = {one.id: str(one.position) for one in ordered}
    struck_by = {one.strikes: str(one.position) for one in ordered if one.strikes}
    for one in ordered:
        yield [
            sheet.number,
            str(one.position),
            str(one.replicate),
            one.slot,
            str(one.segment),
            one.text,
            one.unit or "",
            one.raw or "",
            positions.get(one.strikes or "", ""),
            struck_by.get(one.id, ""),
            one.reason or "",
            one.printed_name,
            one.posted_by if one.posted_by != one.person_id else "",
            *_times(one),
            "late" if one.late else "",
            one.id,
        ]


def _times(one: WrittenEntry) -> tuple[str, str, str]:
    return one.received_at.isoformat(), _iso(one.device_at), one.device_zone or ""


def _iso(at: datetime | None) -> str:
    return at.isoformat() if at else ""
