"""The cells of a curve's table before its columns are understood: rows, numbers, the header."""

import re
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from decimal import Decimal
from typing import Any

from server.lab.refusal import Unacceptable

MOST_ROWS, MOST_COLUMNS = 200_000, 50
_SHOWN_CELL = 40
_NUMBER = re.compile(r"[+-]?(\d+(\.\d*)?|\.\d+)([eE][+-]?\d{1,2})?")
_MOST_NUMBER = 40
#: A double precision number is written with 17 digits, and noise about zero begins at the 16th.
_FINEST, _COARSEST = -34, 8

Row = tuple[int, tuple[str, ...]]


@dataclass(frozen=True, slots=True)
class TableShape:
    """What a table looks like: its header, how many columns, its first rows as they stand."""

    header: tuple[str, ...] | None
    width: int
    sample: tuple[Row, ...]

    def to_document(self) -> dict[str, Any]:
        """Return the shape as a JSON-able document."""
        rows = [
            {"row": number, "cells": [one[:_SHOWN_CELL] for one in row]}
            for number, row in self.sample
        ]
        header = None if self.header is None else [one[:_SHOWN_CELL] for one in self.header]
        return {"header": header, "width": self.width, "rows": rows}


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
        number = self._decimal(text)
        place = self.where(row, column)
        if number is not None and _FINEST <= int(number.as_tuple().exponent) <= _COARSEST:
            return number
        plain = text.strip()
        if number is not None:
            says = f"{place}: “{plain[:40]}” is too large or too small to be a reading."
        elif plain[:1] in {"=", "@"} or re.match(r"[+-][A-Za-z(]", plain):
            says = f"{place}: “{plain[:40]}” is a formula; only numbers are taken."
        elif not plain:
            says = f"{place} is empty; a point needs its volume and its reading."
        else:
            says = f"{place}: “{plain[:40]}” is not a number."
        shown = {"row": row, "column": column + 1}
        raise Unacceptable(says, field="file", example="12.35", shown=shown)

    def is_number(self, text: str) -> bool:
        """Tell whether a cell could be a number."""
        return self._decimal(text) is not None

    def told(self, row: Sequence[str]) -> list[Decimal | None]:
        """Return a row's numbers, None where a cell holds none."""
        return [self._decimal(one) for one in row]

    def _decimal(self, text: str) -> Decimal | None:
        plain = text.strip().replace("−", "-")
        if self.decimal_comma:
            plain = plain.replace(",", ".")
        return Decimal(plain) if len(plain) <= _MOST_NUMBER and _NUMBER.fullmatch(plain) else None

    def is_value(self, text: str) -> bool:
        """Tell whether a cell stands where a number does: a number, or a formula for one."""
        return self.is_number(text) or text.lstrip().startswith("=")


def split_table(cells: Cells) -> tuple[tuple[str, ...] | None, list[Row], int]:
    """Return the header (None: there is none), the rows of numbers, and how many lines came before.

    The table begins at the first row with two numbers; a row of words right before it is its
    header. Rows that are empty are passed over.
    """
    rows = [(number, row) for number, row in cells.rows if any(one.strip() for one in row)]
    begins = (
        at
        for at, (_, row) in enumerate(rows)
        if sum(cells.is_value(one) for one in row) >= 2 and cells.is_value(row[0])
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
