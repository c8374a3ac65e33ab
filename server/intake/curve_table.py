"""Rows of a curve's table become points: numbers checked, one bad volume pointed at."""

from collections.abc import Sequence
from dataclasses import dataclass
from decimal import Decimal
from itertools import pairwise

from server.curves.points import FEWEST_POINTS, Points
from server.intake.curve_cells import MOST_ROWS, Cells, Row, TableShape, split_table
from server.intake.curve_columns import (
    READING_UNITS,
    TIME_UNITS,
    VOLUME_UNITS,
    ColumnMapping,
    RememberedColumns,
    columns_of,
    taken_words,
)
from server.lab.refusal import Unacceptable

_SHOWN_ROWS = 6
#: What a probe can read at all, bubbles included, and what no burette delivers.
_POSSIBLE = {"pH": (Decimal(-3), Decimal(17)), "mV": (Decimal(-5000), Decimal(5000))}
_MOST_ML = Decimal(100_000)


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
class Asked:
    """How a table is to be read, beyond what it says itself.

    ``mapping`` was set by a person and rules; ``remembered`` counts where the same header comes
    again. ``leave_out`` are rows of the file, from 1, that hold no numbers and are passed over by
    a person's word. ``most_points`` bounds what is kept.
    """

    mapping: ColumnMapping | None = None
    remembered: RememberedColumns | None = None
    drop: Drop | None = None
    leave_out: tuple[int, ...] = ()
    most_points: int = MOST_ROWS


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
    shape: TableShape
    relative_u_volume: float | None = None

    def points(self) -> Points:
        """Return the points as numbers."""
        seconds = None if self.seconds is None else tuple(map(float, self.seconds))
        return Points(
            self.kind, tuple(map(float, self.volume_mL)), tuple(map(float, self.reading)), seconds
        )


def curve_of(cells: Cells, *, sha256: str, asked: Asked | None = None) -> CurveTable:
    """Return the curve that a table of cells holds.

    Raises:
        Unacceptable: no table, a cell that is no number, fewer than 6 points, volumes that go back
            more than once, drops without the volume of a drop. ``shown["table"]`` is what the table
            looks like, ``shown["row"]`` the row that it is about.
    """
    asked = asked or Asked()
    header, body, passed = split_table(cells)
    width = max(len(row) for _, row in body)
    shape = TableShape(header, width, tuple(body[:_SHOWN_ROWS]))
    try:
        return _curve(cells, body, shape, sha256=sha256, asked=asked, passed=passed)
    except Unacceptable as refused:
        refused.shown.setdefault("table", shape.to_document())
        raise


def _columns(
    cells: Cells, body: Sequence[Row], shape: TableShape, asked: Asked
) -> tuple[ColumnMapping, list[str]]:
    """Return which column holds what, and words on how that was told."""
    if asked.mapping is not None:
        mapping, says = asked.mapping, "Columns as you set them."
    elif asked.remembered is not None and asked.remembered.fits(shape.header, shape.width):
        mapping, says = asked.remembered.mapping, "Columns as in this instrument's last file."
    else:
        told = [cells.told(row) for _, row in body[:500]]
        return columns_of(shape.header, told)
    if mapping.last >= shape.width:
        says = f"Column {mapping.last + 1} is asked for; the table has {shape.width}."
        raise Unacceptable(says, field="mapping", example="0")
    return mapping, [taken_words(mapping, shape.header), says]


def _left_out(
    cells: Cells, mapping: ColumnMapping, body: Sequence[Row], asked: Asked
) -> list[SetAside]:
    """Return the rows that a person passes over; only such as hold no readings can be."""
    by_number, scale = dict(body), _volume_scale(mapping, asked.drop)
    aside = []
    for number in sorted(set(asked.leave_out)):
        row = by_number.get(number)
        if row is None:
            says = f"Row {number} is none of the table's rows; it cannot be left out."
            raise Unacceptable(says, field="leave_out")
        try:
            _point(cells, mapping, number, row, scale=scale)
        except Unacceptable as unread:
            aside.append(SetAside(number, f"Left out by hand. {unread.says}"))
            continue
        says = f"Row {number} holds numbers; a reading is not left out of a curve by hand."
        raise Unacceptable(says, field="leave_out")
    return aside


def _curve(
    cells: Cells,
    body: Sequence[Row],
    shape: TableShape,
    *,
    sha256: str,
    asked: Asked,
    passed: int,
) -> CurveTable:
    if len(body) > asked.most_points:
        says = (
            f"The table has {len(body)} rows; a curve is kept with at most {asked.most_points} "
            "points. Export fewer readings, every second one for instance."
        )
        raise Unacceptable(says, field="file")
    words = list(cells.says)
    if passed:
        words.append(f"{passed} line{'s' if passed > 1 else ''} before the table passed over.")
    mapping, more = _columns(cells, body, shape, asked)
    words += more
    try:
        return _points_of(cells, body, mapping, words, shape=shape, sha256=sha256, asked=asked)
    except Unacceptable as refused:
        refused.shown.setdefault("mapping", mapping.to_document())
        raise


def _points_of(
    cells: Cells,
    body: Sequence[Row],
    mapping: ColumnMapping,
    words: Sequence[str],
    *,
    shape: TableShape,
    sha256: str,
    asked: Asked,
) -> CurveTable:
    """Return the curve in columns that are understood."""
    scale = _volume_scale(mapping, asked.drop)
    by_hand = _left_out(cells, mapping, body, asked)
    body = [(number, row) for number, row in body if number not in set(asked.leave_out)]
    points = [_point(cells, mapping, number, row, scale=scale) for number, row in body]
    numbers = [number for number, _ in body]
    aside = _set_aside(numbers, [one[0] for one in points], cells, mapping)
    keep = [at for at in range(len(points)) if at not in {row for row, _ in aside}]
    if len(keep) < FEWEST_POINTS:
        says = f"The table has {len(keep)} points; a curve needs at least {FEWEST_POINTS}."
        raise Unacceptable(says, field="file")
    times = None if mapping.time is None else [_time(cells, mapping, *body[at]) for at in keep]
    if times is not None:
        _never_back(times, [numbers[at] for at in keep], cells, mapping)
    relative, drop = None, asked.drop
    if drop is not None and mapping.volume_unit == "drops" and drop.u_mL is not None:
        relative = float(drop.u_mL / drop.volume_mL)
    return CurveTable(
        kind=mapping.kind,
        volume_mL=tuple(_text(points[at][0] * scale) for at in keep),
        reading=tuple(_text(points[at][1] * READING_UNITS[mapping.reading_unit]) for at in keep),
        seconds=None if times is None else tuple(map(_text, times)),
        rows=tuple(numbers[at] for at in keep),
        mapping=mapping,
        set_aside=(*by_hand, *(SetAside(numbers[row], says) for row, says in aside)),
        says=(*words, *(says for _, says in aside)),
        sha256=sha256,
        shape=shape,
        relative_u_volume=relative,
    )


def _text(value: Decimal) -> str:
    return f"{value:f}"


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
    cells: Cells, mapping: ColumnMapping, number: int, row: tuple[str, ...], *, scale: Decimal
) -> tuple[Decimal, Decimal]:
    """Return volume and reading of a row in the file's own units, both possible ones."""
    volume = _cell(cells, number, row, mapping.volume)
    reading = _cell(cells, number, row, mapping.reading)
    low, high = _POSSIBLE[mapping.kind]
    looked_at = (
        (mapping.volume, volume * scale, "mL", (Decimal(0), _MOST_ML)),
        (mapping.reading, reading * READING_UNITS[mapping.reading_unit], mapping.kind, (low, high)),
    )
    for column, value, unit, (least, most) in looked_at:
        if not least <= value <= most:
            says = (
                f"{cells.where(number, column)}: {_text(value)} {unit} is not possible on a curve "
                f"({least} to {most} {unit})."
            )
            raise Unacceptable(says, field="file", shown={"row": number, "column": column + 1})
    return volume, reading


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
