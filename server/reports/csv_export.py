"""Lists as CSV text that a spreadsheet opens without running anything of it."""

import csv
import io
import re
from collections.abc import Sequence

#: What a spreadsheet may take for the beginning of a formula: OWASP ASVS 1.2.10 lists = + - @ tab
#: and NUL; a carriage return belongs to them as well. Spaces before it do not disarm it.
_DANGEROUS = re.compile(r"'*[ ]*[=+\-@\t\r\n\x00＝＋－＠]")
_NUMBER = re.compile(r"[+-]?\d+(\.\d+)?([eE][+-]?\d{1,3})?", re.ASCII)
_GUARD = "'"
#: So that a spreadsheet reads the file as UTF-8.
_MARK = "\ufeff"


def write_csv(
    headings: Sequence[str], rows: Sequence[Sequence[str]], *, numeric: Sequence[str] = ()
) -> bytes:
    """Return rows as CSV (RFC 4180, UTF-8 with a mark): text as it is, made harmless.

    A cell that a spreadsheet might run gets a leading apostrophe; ``numeric`` names the headings
    whose cells may be true numbers, so that −0.0003 stays a number there and nowhere else.

    Raises:
        ValueError: a row that does not fit the headings, a numeric heading that is not there.
    """
    unknown = [one for one in numeric if one not in headings]
    if unknown:
        says = f"{', '.join(unknown)}: no such heading"
        raise ValueError(says)
    held = io.StringIO()
    writer = csv.writer(held, lineterminator="\r\n", quoting=csv.QUOTE_MINIMAL)
    writer.writerow([guarded(one) for one in headings])
    for i, row in enumerate(rows, start=1):
        if len(row) != len(headings):
            says = f"row {i} has {len(row)} cells for {len(headings)} headings"
            raise ValueError(says)
        writer.writerow(
            [
                guarded(cell, number=heading in numeric)
                for heading, cell in zip(headings, row, strict=True)
            ]
        )
    return (_MARK + held.getvalue()).encode("utf-8")


def read_csv_back(data: bytes) -> list[list[str]]:
    """Return the headings and rows of a file that ``write_csv`` made, exactly as they were."""
    text = data.decode("utf-8").removeprefix(_MARK)
    return [[unguarded(cell) for cell in row] for row in csv.reader(io.StringIO(text, newline=""))]


def guarded(cell: str, *, number: bool = False) -> str:
    """Return a cell with a leading apostrophe where a spreadsheet might run it."""
    if number and _NUMBER.fullmatch(cell):
        return cell
    return _GUARD + cell if _DANGEROUS.match(cell) else cell


def unguarded(cell: str) -> str:
    """Return a cell without the apostrophe that ``guarded`` put before it."""
    if cell.startswith(_GUARD) and _DANGEROUS.match(cell):
        return cell[len(_GUARD) :]
    return cell
