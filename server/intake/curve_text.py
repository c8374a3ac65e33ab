"""A curve from CSV, TSV or pasted text: separator and decimal mark found, and said."""

import csv
import io
import re
from collections import Counter
from collections.abc import Sequence

from server.intake.curve_cells import Cells, Row
from server.intake.curve_table import Asked, CurveTable, curve_of
from server.intake.kept_files import sha256_of
from server.lab.refusal import Unacceptable

MOST_BYTES, MOST_LINE, MOST_LINES = 5_000_000, 10_000, 200_500
_SEPARATORS = {"\t": "tab", ";": "semicolon", ",": "comma", " ": "spaces"}
_POINT = re.compile(r"[+\-−]?\d*\.\d+([eE][+-]?\d+)?")
_COMMA = re.compile(r"[+\-−]?\d+,\d+([eE][+-]?\d+)?")
_BEGINS = re.compile(r"\s*(x|[+\-−]?[.,]?\d)")
_QUOTED = re.compile(r'"[^"]*"')


def read_curve_text(data: bytes | str, *, asked: Asked | None = None) -> CurveTable:
    """Return the curve in a text: comma, semicolon, tab or spaces; decimal point or comma.

    Two columns, volume and pH or mV, a third of seconds; a header names them otherwise. Lines that
    begin with # are passed over.

    Raises:
        Unacceptable: too large, no text, no table, a cell that is no number; row and column named.
    """
    raw = data.encode() if isinstance(data, str) else data
    text = _text(raw)
    lines = [
        (number, line)
        for number, line in enumerate(text.splitlines(), start=1)
        if line.strip() and not line.lstrip().startswith("#")
    ]
    if not lines:
        raise Unacceptable("There is no table in this text.", field="file", example="0.00; 4.01")
    for number, line in lines:
        if len(line) > MOST_LINE:
            says = f"Row {number} has {len(line)} characters; at most {MOST_LINE} are read."
            raise Unacceptable(says, field="file")
    separator = _separator([line for _, line in lines])
    rows: list[Row] = [(number, _cells(line, separator, number)) for number, line in lines]
    comma = _decimal_comma(rows, separator)
    said = f"Separator: {_SEPARATORS[separator]}; decimal {'comma' if comma else 'point'}."
    cells = Cells(rows, _where, (said,), comma)
    return curve_of(cells, sha256=sha256_of(raw), asked=asked)


def _where(row: int, column: int) -> str:
    return f"Row {row}, column {column + 1}"


def _text(data: bytes) -> str:
    if len(data) > MOST_BYTES:
        says = f"The file has {len(data) / 1e6:.1f} MB; at most {MOST_BYTES / 1e6:g} MB are read."
        raise Unacceptable(says, field="file")
    encoding = "utf-16" if data[:2] in {b"\xff\xfe", b"\xfe\xff"} else "utf-8-sig"
    try:
        text = data.decode(encoding)
    except UnicodeDecodeError:
        # instruments of long ago write the micro sign in one byte
        text = data.decode("cp1252", errors="replace")
    if any(one < " " and one not in "\t\r\n\f" for one in text):
        raise Unacceptable("The file holds characters that no text has.", field="file")
    if text.count("\n") > MOST_LINES or text.count("\r") > MOST_LINES:
        raise Unacceptable(f"The file has more than {MOST_LINES} lines.", field="file")
    return text


def _separator(lines: Sequence[str]) -> str:
    """Return the first of tab, semicolon, comma, spaces that most lines of numbers have.

    A comma counts only where it is not the only decimal mark: ``0,50 4,03`` is two numbers.
    """
    bare = [_QUOTED.sub("x", line) for line in lines]
    words = [line for line in bare if not _BEGINS.match(line)]
    numbers = [line for line in bare if _BEGINS.match(line)] or bare
    enough = 0.6 * len(numbers)
    for mark in ("\t", ";"):
        if sum(mark in line for line in numbers) >= enough:
            return mark
    spaced = sum(len(line.split()) > 1 for line in numbers) >= enough
    if spaced and not any(re.search(r",\s", line) for line in numbers):
        parts = [part for line in numbers for part in line.split()]
        if sum(bool(_COMMA.fullmatch(one) or "," not in one) for one in parts) >= 0.9 * len(parts):
            return " "
    if sum("," in line for line in numbers) >= enough:
        most = Counter(line.count(",") for line in numbers).most_common(1)[0][0]
        named = any(line.count(",") == most for line in words)
        if most >= 3 and not named and not any("." in line for line in numbers):
            says = (
                "Commas seem to stand both between the columns and as decimal marks; that cannot "
                "be told apart. Save with semicolons or tabs."
            )
            raise Unacceptable(says, field="file", example="0,50; 4,03")
        return ","
    if spaced:
        return " "
    says = "No separator was found between volume and reading: comma, semicolon, tab or spaces."
    raise Unacceptable(says, field="file", example="0.50; 4.03")


def _cells(line: str, separator: str, number: int) -> tuple[str, ...]:
    if separator == " ":
        return tuple(line.split())
    try:
        rows = list(csv.reader(io.StringIO(line), delimiter=separator, strict=True))
    except csv.Error as problem:
        says = f"Row {number} cannot be read: its quotation marks do not close."
        raise Unacceptable(says, field="file") from problem
    return tuple(one.strip() for one in rows[0]) if rows else ()


def _decimal_comma(rows: Sequence[Row], separator: str) -> bool:
    """Tell whether numbers have a decimal comma.

    Raises:
        Unacceptable: some have a comma and some a point.
    """
    if separator == ",":
        quoted = any(_COMMA.fullmatch(one) for _, row in rows for one in row)
        pointed = any(_POINT.fullmatch(one) for _, row in rows for one in row)
        return quoted and not pointed
    comma = point = None
    for number, row in rows:
        for at, one in enumerate(row):
            if comma is None and _COMMA.fullmatch(one):
                comma = (number, at)
            elif point is None and _POINT.fullmatch(one):
                point = (number, at)
    if comma and point:
        says = (
            f"Decimal comma in {_where(*comma).lower()} and decimal point in "
            f"{_where(*point).lower()}; use one of them."
        )
        raise Unacceptable(says, field="file")
    return comma is not None
