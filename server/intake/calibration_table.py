"""A calibration's table from CSV text or a workbook: recognised, and shown before it is taken."""

from collections.abc import Sequence
from dataclasses import dataclass
from decimal import Decimal
from itertools import pairwise
from typing import Any

from server.intake.table_columns import (
    BASE_UNITS,
    ERROR,
    Column,
    decimal_text,
    read_columns,
    scaled,
)
from server.intake.table_text import CellGrid, read_grid, workbook_grid
from server.intake.workbook import is_workbook
from server.lab.refusal import Unacceptable
from server.metrology.decimal_text import DecimalProblem, read_wire_decimal

_CORRECTION, _OF_REFERENCE = "correction, added to a reading", "reference less reading"
_OF_ERROR = "error of indication, taken away from a reading"


@dataclass(frozen=True, slots=True)
class TableRow:
    """One point: the reading, what is added to it, and its standard uncertainty, as text."""

    reading: str
    correction: str
    u: str | None


@dataclass(frozen=True, slots=True)
class CalibrationTable:
    """A table as it was understood, for a person to confirm.

    ``sign`` says how the second column became what is added to a reading; ``says`` are sentences
    about what was recognised, among them one worked reading. ``fragment`` is the part of a
    calibration's document that the table makes.
    """

    kind: str
    unit: str
    rows: tuple[TableRow, ...]
    columns: tuple[str, ...]
    sign: str
    says: tuple[str, ...]
    fragment: dict[str, Any]


def read_calibration_table(
    data: bytes, kind: str, *, sheet: str | None = None, means: str | None = None
) -> CalibrationTable:
    """Return the table of errors that a CSV text or an XLSX workbook holds.

    ``kind`` is balance, burette or thermometer; ``sheet`` the name of a workbook's sheet (None: its
    only one); ``means`` "correction" or "error" where a person knows better than the header. A
    header names the columns (reading, reference, correction, error, u, U, k) with their units. An
    error is reading less true value (VIM 2.16), so a correction is its opposite.

    Raises:
        Unacceptable: it cannot be read; the sentence names row and column.
    """
    if kind not in BASE_UNITS:
        says = f"kind cannot be “{kind[:40]}”; it is one of {', '.join(BASE_UNITS)}."
        raise Unacceptable(says, field="kind", example="balance")
    if means not in {None, "correction", "error"}:
        raise Unacceptable("means must be correction or error.", field="means", example="error")
    grid = workbook_grid(data, sheet) if is_workbook(data) else read_grid(data)
    columns = read_columns(grid, kind)
    return _table(grid, kind, columns if means is None else _renamed(columns, means))


def _renamed(columns: dict[str, Column], means: str) -> dict[str, Column]:
    """Return the columns with that of the correction or error called as a person says."""
    told = columns.get("correction") or columns.get(ERROR)
    if told is None:
        says = "There is no column of corrections or errors: the reference tells the sign."
        raise Unacceptable(says, field="means")
    others = {role: one for role, one in columns.items() if role not in {"correction", ERROR}}
    return {**others, means: told}


def _table(grid: CellGrid, kind: str, columns: dict[str, Column]) -> CalibrationTable:
    unit = BASE_UNITS[kind]
    rows: list[TableRow] = []
    for number, cells in grid.body:
        numbers = {role: _number(grid, number, one, cells) for role, one in columns.items()}
        rows.append(_row(grid, number, columns, numbers))
    if len(rows) < 2:
        raise Unacceptable("The table needs at least two rows of numbers.", field="file")
    for (before, _), (after, number) in pairwise(
        [(Decimal(one.reading), at) for one, (at, _) in zip(rows, grid.body, strict=True)]
    ):
        if before >= after:
            says = f"Row {number}: the {columns['reading'].label} must rise from row to row."
            raise Unacceptable(says, field="file")
    sign = _sign(columns)
    first = max(rows, key=lambda one: abs(Decimal(one.correction)))
    true = Decimal(first.reading) + Decimal(first.correction)
    worked = f"A reading of {first.reading} {unit} is then taken as {decimal_text(true)} {unit}."
    return CalibrationTable(
        kind=kind,
        unit=unit,
        rows=tuple(rows),
        columns=tuple(f"{role}: {one.words}" for role, one in columns.items()),
        sign=sign,
        says=(*grid.says, *(one.says for one in columns.values() if one.says), worked),
        fragment=_fragment(kind, unit, rows),
    )


def _sign(columns: dict[str, Column]) -> str:
    if "correction" in columns:
        return _CORRECTION
    return _OF_ERROR if ERROR in columns else _OF_REFERENCE


def _row(
    grid: CellGrid, number: int, columns: dict[str, Column], numbers: dict[str, Decimal | None]
) -> TableRow:
    def need(role: str) -> Decimal:
        found = numbers[role]
        if found is None:
            says = f"{grid.where(number, columns[role].index)}: the {role} is missing."
            raise Unacceptable(says, field="file")
        return found

    reading = need("reading")
    told = {
        role: sign * need(role)
        for role, sign in (("correction", 1), (ERROR, -1))
        if role in columns
    }
    if "reference" in columns:
        told["reference"] = need("reference") - reading
    added = next(iter(told.values()))
    for role, value in told.items():
        # two columns that tell the same must agree within their last digits: it shows a wrong sign
        digits = max(_exponent(one) for one in (reading, added, value))
        if abs(value - added) > 2 * Decimal(1).scaleb(digits):
            says = (
                f"Row {number}: by the column “{columns[role].label}” {decimal_text(value)} is "
                f"added to the reading, by “{columns[next(iter(told))].label}” "
                f"{decimal_text(added)}. An error is reading less reference, a correction its "
                "opposite."
            )
            raise Unacceptable(says, field="file")
    return TableRow(decimal_text(reading), decimal_text(added), _u(grid, number, columns, numbers))


def _exponent(value: Decimal) -> int:
    return int(value.as_tuple().exponent)


def _u(
    grid: CellGrid, number: int, columns: dict[str, Column], numbers: dict[str, Decimal | None]
) -> str | None:
    u, U, k = numbers.get("u"), numbers.get("U"), numbers.get("k")
    if U is not None and k is None:
        k = columns["U"].k
    for role in ("u", "U", "k"):
        value = numbers.get(role)
        if value is not None and (value < 0 or (role == "k" and value == 0)):
            says = f"{grid.where(number, columns[role].index)}: {role} must be above zero."
            raise Unacceptable(says, field="file")
    if u is not None:
        return decimal_text(u)
    if U is None:
        return None
    if k is None:
        says = (
            f"{grid.where(number, columns['U'].index)}: U is stated without its coverage factor; "
            "add a column k."
        )
        raise Unacceptable(says, field="file")
    return decimal_text(round(U / k, 12).normalize())


def _number(grid: CellGrid, number: int, column: Column, cells: Sequence[str]) -> Decimal | None:
    text = cells[column.index].strip() if column.index < len(cells) else ""
    if not text:
        return None
    plain = text.replace("−", "-")
    if grid.decimal_comma:
        plain = plain.replace(",", ".")
    where = grid.where(number, column.index)
    if text[0] in "=@":
        says = f"{where}: “{text[:40]}” is a formula; only numbers are taken."
        raise Unacceptable(says, field="file")
    try:
        value = read_wire_decimal(plain, where)
    except DecimalProblem as problem:
        says = f"{where}, {column.label}: “{text[:40]}” is not a number."
        raise Unacceptable(says, field="file", example=problem.example) from problem
    return scaled(value, column)


def _fragment(kind: str, unit: str, rows: Sequence[TableRow]) -> dict[str, Any]:
    """Return the part of a calibration's document: the table and the largest u of its points."""
    table = [[one.reading, one.correction] for one in rows]
    if kind == "balance" and Decimal(table[0][0]) > 0:
        table.insert(0, ["0", "0"])
    found: dict[str, Any] = {"error_table": table}
    stated = [Decimal(one.u) for one in rows if one.u is not None]
    key = {"balance": "error_u", "burette": "delivery", "thermometer": "reading"}[kind]
    if stated and len(stated) == len(rows):
        found[key] = {"unit": unit, "u": decimal_text(max(stated))}
    return found
