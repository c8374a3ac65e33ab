"""A curve from a sheet of an XLSX workbook."""

from server.intake.curve_cells import Cells
from server.intake.curve_table import Asked, CurveTable, curve_of
from server.intake.curve_text import read_curve_text
from server.intake.kept_files import sha256_of
from server.intake.workbook import column_name, is_workbook, read_workbook
from server.lab.refusal import Unacceptable


def read_curve_workbook(
    data: bytes, *, sheet: str | None = None, asked: Asked | None = None
) -> CurveTable:
    """Return the curve in a workbook's sheet; without a name its only sheet that is filled.

    Raises:
        Unacceptable: no workbook, too large, a formula, no such sheet, no curve in it; the cell
            named.
    """
    filled = [one for one in read_workbook(data, formulas=True) if one.rows]
    named = filled if sheet is None else [one for one in filled if one.name == sheet]
    if len(named) != 1:
        names = ", ".join(f"“{one.name}”" for one in filled) or "none that is filled"
        says = f"Name the sheet that holds the curve; the workbook has {names}."
        raise Unacceptable(says, field="sheet", example=filled[0].name if filled else None)
    rows = [
        (number, row)
        for number, row in enumerate(named[0].rows, start=1)
        if any(row) and not next(one for one in row if one).startswith("#")
    ]
    cells = Cells(rows, _where, (f"Sheet “{named[0].name}”.",))
    return curve_of(cells, sha256=sha256_of(data), asked=asked)


def _where(row: int, column: int) -> str:
    return f"Cell {column_name(column)}{row}"


def read_curve_file(
    data: bytes, *, sheet: str | None = None, asked: Asked | None = None
) -> CurveTable:
    """Return the curve in an uploaded file, a workbook or a text, told by its bytes.

    Raises:
        Unacceptable: it cannot be read; the sentence names row and column.
    """
    if is_workbook(data):
        return read_curve_workbook(data, sheet=sheet, asked=asked)
    if data.startswith(b"\xd0\xcf\x11\xe0"):
        says = "This is a workbook of the old binary kind; save it as XLSX or as CSV."
        raise Unacceptable(says, field="file")
    return read_curve_text(data, asked=asked)
