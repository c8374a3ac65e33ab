"""Rows of a curve's table become points: numbers checked, one bad volume pointed at."""

import re
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from decimal import Decimal
from itertools import pairwise

from server.curves.points import FEWEST_POINTS, Points
from server.intake.curve_columns import (
    READING_UNITS,
    TIME_UNITS,
    VOLUME_UNITS,
    ColumnMapping,
    columns_of,
)
from server.lab.refusal import Unacceptable

MOST_ROWS, MOST_COLUMNS = 200_000, 50
_NUMBER = re.compile(r"[+-]?(\d+(\.\d*)?|\.\d+)([eE][+-]?\d{1,2})?")
_MOST_NUMBER = 40

Row = tuple[int, tuple[str, ...]]


@dataclass(frozen=True, slots=True)
class Drop:
    """The calibrated volume of one drop in mL, with its u: one and the same for every point."""

    volume_mL: Decimal
    u_mL: Decimal | None = None


@dataclass(frozen=True, slots=True)
class SetAside:
    """A row that was not taken, and why."""

    row: int
    says: str


@dataclass(frozen=True, slots=True)
class CurveTable:
    """A curve as it was understood, for a person to confirm before it is kept.

    ``volume_mL``, ``reading`` and ``seconds`` are decimals as text in mL, pH or mV, and s; ``rows``
    the row of the file that each point came from; ``says`` sentences on what was recognised.
    ``relative_u_volume`` is shared by all points where drops were counted.
    """

    kind: str
    volume_mL: tuple[str, ...]
    reading: tuple[str, ...]
    seconds: tuple[str, ...] | None
    rows: tuple[int, ...]
    mapping: ColumnMapping
    set_aside: tuple[SetAside, ...]
    says: tuple[str, ...]
    sha256: str
    relative_u_volume: float | None = None

    def points(self) -> Points:
        """Return the points as numbers."""
        seconds = None if self.seconds is None else tuple(map(float, self.seconds))
        return Points(
            self.kind, tuple(map(float, self.volume_mL)), tuple(map(float, self.reading)), seconds
        )


@dataclass(frozen=True, slots=True)
class Cells:
    """A table before its columns are understood: rows with their numbers, words on its shape.

    ``where`` names a cell by row and column (from 0) as the reader of the file would.
    """

    rows: Sequence[Row]
    where: Callable[[int, int], str]
    says: tuple[str, ...]
    decimal_comma: bool = False

    def number(self, row: int, column: int, text: str) -> Decimal:
        """Return a cell's number.

        Raises:
            Unacceptable: it is none; the sentence names row and column.
        """
        plain = text.strip().replace("−", "-")
        if self.decimal_comma:
            plain = plain.replace(",", ".")
        if len(plain) <= _MOST_NUMBER and _NUMBER.fullmatch(plain):
            return Decimal(plain)
        place = self.where(row, column)
        if plain[:1] in {"=", "@"} or re.match(r"[+-][A-Za-z(]", plain):
            says = f"{place}: “{text.strip()[:40]}” is a formula; only numbers are taken."
        elif not plain:
            says = f"{place} is empty; a point needs its volume and its reading."
        else:
            says = f"{place}: “{text.strip()[:40]}” is not a number."
        raise Unacceptable(says, field="file", example="12.35")

    def is_number(self, text: str) -> bool:
        """Tell whether a cell could be a number."""
        plain = text.strip().replace("−", "-")
        if self.decimal_comma:
            plain = plain.replace(",", ".")
        return bool(_NUMBER.fullmatch(plain))


def curve_of(
    cells: Cells, *, sha256: str, mapping: ColumnMapping | None = None, drop: Drop | None = None
) -> CurveTable:
    """Return the curve that a table of cells holds.

    With ``mapping`` (remembered, or given by a person) the header is not asked.

    Raises:
        Unacceptable: no table, a cell that is no number, fewer than 6 points, volumes that go back
            more than once, drops without the volume of a drop.
    """
    header, body, passed = _split(cells)
    words = list(cells.says)
    if passed:
        words.append(f"{passed} line{'s' if passed > 1 else ''} before the table passed over.")
    if mapping is None:
        told = [
            [cells.number(0, 0, one) if cells.is_number(one) else None for one in row]
            for _, row in body[:500]
        ]
        mapping, more = columns_of(header, told)
        words += more
    else:
        words.append("Columns as they were set for this instrument.")
    scale = _volume_scale(mapping, drop)
    points = [_point(cells, mapping, number, row) for number, row in body]
    numbers = [number for number, _ in body]
    aside = _set_aside(numbers, [one[0] for one in points], cells, mapping)
    keep = [at for at in range(len(points)) if at not in {row for row, _ in aside}]
    if len(keep) < FEWEST_POINTS:
        says = f"The table has {len(keep)} points; a curve needs at least {FEWEST_POINTS}."
        raise Unacceptable(says, field="file")
    times = None if mapping.time is None else [_time(cells, mapping, *body[at]) for at in keep]
    if times is not None:
        _never_back(times, [numbers[at] for at in keep], cells, mapping)
    relative = None
    if drop is not None and mapping.volume_unit == "drops" and drop.u_mL is not None:
        relative = float(drop.u_mL / drop.volume_mL)
    return CurveTable(
        kind=mapping.kind,
        volume_mL=tuple(_text(points[at][0] * scale) for at in keep),
        reading=tuple(_text(points[at][1] * READING_UNITS[mapping.reading_unit]) for at in keep),
        seconds=None if times is None else tuple(map(_text, times)),
        rows=tuple(numbers[at] for at in keep),
        mapping=mapping,
        set_aside=tuple(SetAside(numbers[row], says) for row, says in aside),
        says=(*words, *(says for _, says in aside)),
        sha256=sha256,
        relative_u_volume=relative,
    )


def _text(value: Decimal) -> str:
    return f"{value:f}"


def _split(cells: Cells) -> tuple[tuple[str, ...] | None, list[Row], int]:
    """Return the header (None: there is none), the rows of numbers, and how many lines came before.

    The table begins at the first row with two numbers; a row of words right before it is its
    header. Rows that are empty are passed over.
    """
    rows = [(number, row) for number, row in cells.rows if any(one.strip() for one in row)]
    begins = (
        at
        for at, (_, row) in enumerate(rows)
        if sum(cells.is_number(one) for one in row) >= 2 and cells.is_number(row[0])
    )
    at = next(begins, None)
    if at is None:
        says = "No row with two numbers was found: a curve's table has volumes and readings."
        raise Unacceptable(says, field="file", example="0.00; 4.01")
    if len(rows) - at > MOST_ROWS:
        raise Unacceptable(f"The table has more than {MOST_ROWS} rows.", field="file")
    widest = max(len(row) for _, row in rows[at:])
    if widest > MOST_COLUMNS:
        says = f"The table has {widest} columns; at most {MOST_COLUMNS} are read."
        raise Unacceptable(says, field="file")
    before = rows[:at]
    header = None
    if before and sum(bool(one.strip()) for one in before[-1][1]) >= 2:
        header = before.pop()[1]
    return header, rows[at:], len(before)


def _volume_scale(mapping: ColumnMapping, drop: Drop | None) -> Decimal:
    if mapping.volume_unit != "drops":
        return VOLUME_UNITS[mapping.volume_unit]
    if drop is None:
        says = "The volumes are counted in drops; give the calibrated volume of one drop in mL."
        raise Unacceptable(says, field="drop_mL", example="0.0487")
    if drop.volume_mL <= 0:
        says = "The volume of one drop must be above zero."
        raise Unacceptable(says, field="drop_mL", example="0.0487")
    return drop.volume_mL


def _point(
    cells: Cells, mapping: ColumnMapping, number: int, row: tuple[str, ...]
) -> tuple[Decimal, Decimal]:
    """Return volume and reading of a row in the file's own units."""
    volume = _cell(cells, number, row, mapping.volume)
    return volume, _cell(cells, number, row, mapping.reading)


def _cell(cells: Cells, number: int, row: tuple[str, ...], column: int) -> Decimal:
    return cells.number(number, column, row[column] if column < len(row) else "")


def _time(cells: Cells, mapping: ColumnMapping, number: int, row: tuple[str, ...]) -> Decimal:
    return _cell(cells, number, row, mapping.time or 0) * TIME_UNITS[mapping.time_unit]


def _set_aside(
    numbers: Sequence[int], volumes: Sequence[Decimal], cells: Cells, mapping: ColumnMapping
) -> list[tuple[int, str]]:
    """Return the one row whose volume goes back, if without it all volumes grow.

    Raises:
        Unacceptable: volumes go back and leaving one row out does not mend it.
    """
    back = [at + 1 for at, (one, after) in enumerate(pairwise(volumes)) if after < one]
    if not back:
        return []
    at = back[0]
    for wrong in (at, at - 1):
        rest = [one for i, one in enumerate(volumes) if i != wrong]
        if all(one <= after for one, after in pairwise(rest)):
            place = cells.where(numbers[wrong], mapping.volume)
            says = (
                f"{place}: the volume {_text(volumes[wrong])} is out of order and was left out; "
                "its neighbours are "
                f"{_text(volumes[wrong - 1]) if wrong else '(none)'} and "
                f"{_text(volumes[wrong + 1]) if wrong + 1 < len(volumes) else '(none)'}."
            )
            return [(wrong, says)]
    place = cells.where(numbers[at], mapping.volume)
    says = f"{place}: the volume {_text(volumes[at])} is below the one before it, "
    says += f"{_text(volumes[at - 1])}"
    says += (
        f", and so it is in {len(back)} rows. " if len(back) > 1 else ", and so are later ones. "
    )
    says += "A curve's volumes only grow; two curves belong into two files."
    raise Unacceptable(says, field="file")


def _never_back(
    times: Sequence[Decimal], numbers: Sequence[int], cells: Cells, mapping: ColumnMapping
) -> None:
    for at, (one, after) in enumerate(pairwise(times)):
        if after < one:
            place = cells.where(numbers[at + 1], mapping.time or 0)
            raise Unacceptable(f"{place}: the time goes back.", field="file")
