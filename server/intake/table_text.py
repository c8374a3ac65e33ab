"""Rows and cells of a table from outside: separator, decimal mark, comments, header."""

import csv
import io
import re
from collections.abc import Sequence
from dataclasses import dataclass

from server.intake.workbook import column_name, read_workbook
from server.lab.refusal import Unacceptable

_MOST_BYTES, _MOST_ROWS, _MOST_COLUMNS, _MOST_CELL = 1_000_000, 1_000, 40, 200
_SEPARATORS = {"\t": "tab", ";": "semicolon", ",": "comma"}
_COMMA_NUMBER = re.compile(r"\s*[+\-−]?\d+,\d+\s*")
_NUMBER = re.compile(r"\s*[+\-−]?\d+([.,]\d+)?([eE][+-]?\d+)?\s*")


@dataclass(frozen=True, slots=True)
class CellGrid:
    """A table's header and body; a row of the body knows its number as the file counts it.

    ``names`` are the columns' letters where it comes from a workbook, empty for text.
    """

    header: tuple[str, ...]
    header_row: int
    body: tuple[tuple[int, tuple[str, ...]], ...]
    decimal_comma: bool
    says: tuple[str, ...]
    names: tuple[str, ...] = ()

    @property
    def width(self) -> int:
        """How many columns the header has."""
        return len(self.header)

    def where(self, row: int, column: int) -> str:
        """Return a cell's name as the reader of the file would call it."""
        if self.names:
            return f"Cell {self.names[column]}{row}"
        return f"Row {row}, column {column + 1}"


def read_grid(data: bytes) -> CellGrid:
    """Return the table of a CSV text: comma, semicolon or tab, decimal point or comma.

    Blank lines and lines that begin with # are passed over.

    Raises:
        Unacceptable: too large, no text, no header, rows that do not fit it.
    """
    text = _text(data)
    lines = [
        (number, line)
        for number, line in enumerate(text.splitlines(), start=1)
        if line.strip() and not line.lstrip().startswith("#")
    ]
    if not lines:
        raise Unacceptable("The file holds no table.", field="file")
    if len(lines) > _MOST_ROWS:
        says = f"The file has {len(lines)} rows; at most {_MOST_ROWS} are read."
        raise Unacceptable(says, field="file")
    separator = _separator([line for _, line in lines])
    rows = [(number, _cells(line, separator, number)) for number, line in lines]
    grid = _grid(rows)
    body = [cell for _, cells in grid.body for cell in cells]
    comma = separator != "," and any(_COMMA_NUMBER.fullmatch(one) for one in body)
    if comma and any(re.fullmatch(r"\s*[+\-−]?\d+\.\d+\s*", one) for one in body):
        says = "Some numbers have a decimal point and some a decimal comma; use one of them."
        raise Unacceptable(says, field="file")
    words = f"Separator: {_SEPARATORS[separator]}; decimal {'comma' if comma else 'point'}."
    return CellGrid(grid.header, grid.header_row, grid.body, comma, (words,))


def workbook_grid(data: bytes, sheet: str | None) -> CellGrid:
    """Return the table of a workbook's sheet; None takes its only sheet that is filled.

    Raises:
        Unacceptable: no such sheet, more than one, a formula, no header.
    """
    filled = [one for one in read_workbook(data) if one.rows]
    if sheet is not None:
        filled = [one for one in filled if one.name == sheet]
    if len(filled) != 1:
        names = ", ".join(f"“{one.name}”" for one in filled) or "none that is filled"
        says = f"Name the sheet that holds the table; the workbook has {names}."
        raise Unacceptable(says, field="sheet")
    rows = [
        (number, cells)
        for number, cells in enumerate(filled[0].rows, start=1)
        if any(cells) and not next(one for one in cells if one).startswith("#")
    ]
    if not rows:
        raise Unacceptable("The sheet holds no table.", field="sheet")
    grid = _grid(rows)
    letters = tuple(column_name(i) for i in range(len(grid.header)))
    said = (f"Sheet “{filled[0].name}”.",)
    return CellGrid(grid.header, grid.header_row, grid.body, False, said, letters)


def _grid(rows: Sequence[tuple[int, tuple[str, ...]]]) -> CellGrid:
    number, header = rows[0]
    if all(_NUMBER.fullmatch(one) for one in header if one.strip()):
        says = f"Row {number} is numbers: the first row must name the columns with their units."
        raise Unacceptable(says, field="file", example="reading, g; correction, mg")
    width = len(header)
    while width and not header[width - 1].strip():
        width -= 1
    if width > _MOST_COLUMNS:
        says = f"The table has {width} columns; at most {_MOST_COLUMNS} are read."
        raise Unacceptable(says, field="file")
    for at, cells in rows[1:]:
        extra = [one for one in cells[width:] if one.strip()]
        if extra:
            says = (
                f"Row {at} has {len(cells)} cells, the header {width}: “{extra[0][:40]}” is over."
            )
            raise Unacceptable(says, field="file")
    body = tuple((at, tuple(cells[:width])) for at, cells in rows[1:])
    return CellGrid(tuple(header[:width]), number, body, False, ())


def _text(data: bytes) -> str:
    if len(data) > _MOST_BYTES:
        says = f"The file has {len(data) / 1e6:.1f} MB; at most {_MOST_BYTES / 1e6:g} MB are read."
        raise Unacceptable(says, field="file")
    encoding = "utf-16" if data[:2] in {b"\xff\xfe", b"\xfe\xff"} else "utf-8-sig"
    try:
        text = data.decode(encoding)
    except UnicodeDecodeError:
        # tables of older programs: the degree sign and umlauts in one byte
        text = data.decode("cp1252", errors="replace")
    if any(ord(one) < 0x20 and one not in "\t\r\n" for one in text):
        raise Unacceptable("The file holds characters that no text has.", field="file")
    return text


def _separator(lines: Sequence[str]) -> str:
    """Return the separator: the first of tab, semicolon and comma that every line has."""
    for mark in _SEPARATORS:
        if all(mark in line for line in lines):
            return mark
    says = "No separator was found that every row has: tab, semicolon or comma."
    raise Unacceptable(says, field="file", example="reading, g; correction, mg")


def _cells(line: str, separator: str, number: int) -> tuple[str, ...]:
    try:
        rows = list(csv.reader(io.StringIO(line), delimiter=separator, strict=True))
    except csv.Error as problem:
        says = f"Row {number} cannot be read: its quotation marks do not close."
        raise Unacceptable(says, field="file") from problem
    cells = tuple(one.strip() for one in rows[0]) if rows else ()
    for i, one in enumerate(cells):
        if len(one) > _MOST_CELL:
            says = f"Row {number}, column {i + 1} has {len(one)} characters; that is no number."
            raise Unacceptable(says, field="file")
    return cells
