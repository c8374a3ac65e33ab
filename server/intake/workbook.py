"""Tables of an XLSX workbook as text, read within bounds; formulas are never computed."""

import io
import lzma
import re
import struct
import zipfile
import zlib
from dataclasses import dataclass

from server.intake.safe_xml import Bounds, Node, read_xml
from server.lab.refusal import Unacceptable

_MOST_FILE = 5_000_000
_MOST_UNPACKED = 50_000_000
_MOST_MEMBERS = 200
_MOST_RATIO = 100
_MOST_ROWS, _MOST_COLUMNS = 20_000, 60
_XML = Bounds(most_bytes=12_000_000, most_elements=120_000, most_depth=20)
_MAIN = "http://schemas.openxmlformats.org/spreadsheetml/2006/main"
#: What a damaged, encrypted or oddly packed archive raises on its way.
_DAMAGED = (
    zipfile.BadZipFile, NotImplementedError, RuntimeError, EOFError, OSError, ValueError, KeyError,
    zlib.error, lzma.LZMAError, struct.error,
)  # fmt: skip
_CELL = re.compile(r"([A-Z]{1,3})([1-9][0-9]{0,6})")


@dataclass(frozen=True, slots=True)
class Sheet:
    """One sheet: its name and its rows of cells as text; an empty cell is an empty text.

    Rows and columns count from 1 at the sheet's own edge, so that a cell is named as it is shown.
    """

    name: str
    rows: tuple[tuple[str, ...], ...]


def is_workbook(data: bytes) -> bool:
    """Say whether bytes look like an XLSX workbook: a ZIP archive."""
    return data.startswith(b"PK\x03\x04")


def column_name(index: int) -> str:
    """Return the letters of a column that counts from 0: A, B, ..., Z, AA."""
    letters = ""
    number = index + 1
    while number:
        number, rest = divmod(number - 1, 26)
        letters = chr(ord("A") + rest) + letters
    return letters


def read_workbook(data: bytes, *, formulas: bool = False) -> tuple[Sheet, ...]:
    """Return the sheets of an XLSX workbook (ECMA-376), numbers as their shortest decimal text.

    With ``formulas`` a formula comes as its own text with ``=`` before it, never as the value that
    was last computed; else it is refused.

    Raises:
        Unacceptable: no workbook, too large packed or unpacked, macros, an error value, a formula.
    """
    if len(data) > _MOST_FILE:
        says = f"The workbook has {len(data) / 1e6:.1f} MB; at most {_MOST_FILE / 1e6:g} are read."
        raise Unacceptable(says, field="file")
    try:
        with zipfile.ZipFile(io.BytesIO(data)) as archive:
            members = _Members(archive)
            strings = _shared_strings(members)
            return tuple(
                Sheet(name, _Cells(strings, name, formulas=formulas).rows(members.xml(path)))
                for name, path in _sheet_paths(members)
            )
    except _DAMAGED as problem:
        raise Unacceptable("The file is no workbook that can be read.", field="file") from problem


class _Members:
    """The parts of the archive, each unpacked within what is left of the bound."""

    def __init__(self, archive: zipfile.ZipFile) -> None:
        listed = archive.infolist()
        stated = sum(one.file_size for one in listed)
        packed = sum(one.compress_size for one in listed)
        if len(listed) > _MOST_MEMBERS or stated > _MOST_UNPACKED:
            says = "The workbook would unpack to more than is read here."
            raise Unacceptable(says, field="file")
        if stated > 1_000_000 and stated > _MOST_RATIO * max(packed, 1):
            says = "The workbook unpacks to far more than it holds; it is not read."
            raise Unacceptable(says, field="file")
        self._archive = archive
        self.names = {one.filename for one in listed}
        if any(name.endswith("vbaProject.bin") for name in self.names):
            says = "The workbook holds macros; save it as XLSX without them."
            raise Unacceptable(says, field="file")
        self._left = _MOST_UNPACKED

    def xml(self, name: str) -> Node:
        if name not in self.names:
            raise Unacceptable(f"The workbook has no part {name[:80]}.", field="file")
        with self._archive.open(name) as part:
            # a header may state less than there is: what is unpacked is counted, not believed
            data = part.read(min(self._left, _XML.most_bytes) + 1)
        self._left -= len(data)
        if self._left < 0:
            says = "The workbook would unpack to more than is read here."
            raise Unacceptable(says, field="file")
        return read_xml(data, bounds=_XML, what=f"The workbook's part {name[:80]}")


def _sheet_paths(members: _Members) -> list[tuple[str, str]]:
    book = members.xml("xl/workbook.xml")
    targets = {
        one.attributes.get("Id", ""): one.attributes.get("Target", "")
        for one in members.xml("xl/_rels/workbook.xml.rels").all("Relationship")
        if one.attributes.get("TargetMode") != "External"
    }
    sheets = book.one("sheets")
    found = []
    for one in sheets.all("sheet") if sheets else ():
        target = targets.get(one.attributes.get("id", ""), "")
        path = target.removeprefix("/") if target.startswith("/") else f"xl/{target}"
        if path in members.names and "worksheet" in path:
            found.append((one.attributes.get("name", "")[:100], path))
    if not found:
        raise Unacceptable("The workbook has no sheet of cells.", field="file")
    return found


def _shared_strings(members: _Members) -> list[str]:
    name = "xl/sharedStrings.xml"
    if name not in members.names:
        return []
    return [_runs(one) for one in members.xml(name).all("si")]


def _runs(node: Node) -> str:
    """Return the text of a string item: its own, or that of its runs without phonetic hints."""
    parts = [one.text for one in node.all("t")]
    parts += [text.text for run in node.all("r") for text in run.all("t")]
    return "".join(parts)


class _Cells:
    """The cells of one sheet as text."""

    def __init__(self, strings: list[str], sheet: str, *, formulas: bool) -> None:
        self._strings, self._sheet, self._formulas = strings, sheet, formulas

    def rows(self, root: Node) -> tuple[tuple[str, ...], ...]:
        data = root.one("sheetData")
        cells: dict[tuple[int, int], str] = {}
        for row in data.all("row") if data else ():
            for cell in row.all("c"):
                text = self._text(cell)
                if text:
                    cells[_place(cell, self._sheet)] = text
        if not cells:
            return ()
        last_row, last_column = max(r for r, _ in cells), max(c for _, c in cells)
        return tuple(
            tuple(cells.get((r, c), "") for c in range(last_column + 1))
            for r in range(last_row + 1)
        )

    def _text(self, cell: Node) -> str:
        where = f"Sheet “{self._sheet}”, cell {cell.attributes.get('r', '?')[:10]}"
        formula = cell.one("f")
        if formula is not None and self._formulas:
            return f"={formula.text}"
        if formula is not None:
            says = f"{where} holds a formula; save the values alone, for nothing is computed here."
            raise Unacceptable(says, field="file")
        kind = cell.attributes.get("t", "n")
        value = cell.one("v")
        held = value.text if value else ""
        if kind == "inlineStr":
            inline = cell.one("is")
            return _runs(inline).strip() if inline else ""
        if kind == "s":
            if not held.isascii() or not held.isdigit() or int(held) >= len(self._strings):
                raise Unacceptable(f"{where} names a text that is not there.", field="file")
            return self._strings[int(held)].strip()
        if kind in {"e", "b"}:
            what = "an error value" if kind == "e" else "a truth value"
            raise Unacceptable(f"{where} holds {what} ({held[:20]}), not a number.", field="file")
        if kind == "n" and held:
            return _shortest(held, where)
        return held.strip()


def _place(cell: Node, sheet: str) -> tuple[int, int]:
    shaped = _CELL.fullmatch(cell.attributes.get("r", ""))
    if not shaped:
        raise Unacceptable(f"A cell of the sheet “{sheet}” has no name.", field="file")
    column = 0
    for letter in shaped[1]:
        column = 26 * column + ord(letter) - ord("A") + 1
    row = int(shaped[2])
    if row > _MOST_ROWS or column > _MOST_COLUMNS:
        says = (
            f"The sheet “{sheet}” is filled as far as {shaped[0]}; at most {_MOST_ROWS} rows and "
            f"{_MOST_COLUMNS} columns are read."
        )
        raise Unacceptable(says, field="file")
    return row - 1, column - 1


def _shortest(held: str, where: str) -> str:
    """Return a stored number as its shortest decimal text: 0.0001 is kept as 9.9999...E-5."""
    try:
        number = float(held)
    except ValueError as problem:
        raise Unacceptable(f"{where} holds no number.", field="file") from problem
    text = repr(number)
    if text in {"nan", "inf", "-inf"}:
        raise Unacceptable(f"{where} holds no number.", field="file")
    return text.removesuffix(".0")
