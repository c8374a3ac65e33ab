"""XLSX workbooks, written part by part (ECMA-376), and hostile ones."""

import io
import zipfile

import pytest

from server.intake.calibration_table import read_calibration_table
from server.intake.workbook import column_name, read_workbook
from server.lab.refusal import Unacceptable

_MAIN = "http://schemas.openxmlformats.org/spreadsheetml/2006/main"
_OFFICE = "http://schemas.openxmlformats.org/officeDocument/2006/relationships"
_PACKAGE = "http://schemas.openxmlformats.org/package/2006/relationships"


def cell(name, value):
    """Return a cell: text inline, a number as stored."""
    if isinstance(value, str):
        return f'<c r="{name}" t="inlineStr"><is><t>{value}</t></is></c>'
    return f'<c r="{name}"><v>{value!r}</v></c>'


def sheet(rows):
    """Return a sheet's part from rows of values; None leaves a cell out."""
    lines = []
    for r, row in enumerate(rows, start=1):
        cells = "".join(
            cell(f"{chr(65 + c)}{r}", value) for c, value in enumerate(row) if value is not None
        )
        lines.append(f'<row r="{r}">{cells}</row>')
    return f'<worksheet xmlns="{_MAIN}"><sheetData>{"".join(lines)}</sheetData></worksheet>'


def workbook(*, sheets=None, parts=None, compression=zipfile.ZIP_DEFLATED):
    """Return a workbook's bytes; ``sheets`` maps names to parts, ``parts`` adds or replaces any."""
    named = sheets or {}
    listed = "".join(
        f'<sheet name="{name}" sheetId="{i}" r:id="rId{i}"/>' for i, name in enumerate(named, 1)
    )
    related = "".join(
        f'<Relationship Id="rId{i}" Type="{_OFFICE}/worksheet" Target="worksheets/sheet{i}.xml"/>'
        for i in range(1, len(named) + 1)
    )
    held = {
        "xl/workbook.xml": f'<workbook xmlns="{_MAIN}" xmlns:r="{_OFFICE}">'
        f"<sheets>{listed}</sheets></workbook>",
        "xl/_rels/workbook.xml.rels": (
            f'<Relationships xmlns="{_PACKAGE}">{related}</Relationships>'
        ),
        **{f"xl/worksheets/sheet{i}.xml": part for i, part in enumerate(named.values(), 1)},
        **(parts or {}),
    }
    buffer = io.BytesIO()
    with zipfile.ZipFile(buffer, "w", compression) as archive:
        for name, part in held.items():
            archive.writestr(name, part)
    return buffer.getvalue()


TABLE = [
    ["load (g)", "error (mg)", "U (mg)", "k"],
    [50.0002, 0.2, 0.1, 2],
    [100.0004, -0.4, 0.16, 2],
    [200.0008, 0.0001, 0.3, 2],
]


def test_cells_come_as_their_shortest_decimal_text():
    # IEEE 754 double, 17 digits, as spreadsheets store it
    part = sheet([["a"], [1]]).replace("<v>1</v>", "<v>1.0000000000000001E-1</v>")
    found = read_workbook(workbook(sheets={"S": part}))
    assert found[0].rows == (("a",), ("0.1",))


def test_table_of_a_workbook_is_read_as_one_of_text():
    table = read_calibration_table(workbook(sheets={"Balance": sheet(TABLE)}), "balance")
    assert [(one.reading, one.correction) for one in table.rows] == [
        ("50.0002", "-0.0002"), ("100.0004", "0.0004"), ("200.0008", "-0.0000001"),
    ]  # fmt: skip
    assert [one.u for one in table.rows] == ["0.00005", "0.00008", "0.00015"]
    assert "Sheet “Balance”." in table.says


def test_shared_and_rich_texts_are_read():
    strings = (
        f'<sst xmlns="{_MAIN}"><si><t>load</t></si>'
        "<si><r><t>correc</t></r><r><t>tion</t></r><rPh><t>x</t></rPh></si></sst>"
    )
    part = sheet([[0, 1], [1, 2], [2, 3]])
    for name in ("A1", "B1"):
        part = part.replace(f'<c r="{name}">', f'<c r="{name}" t="s">')
    data = workbook(sheets={"S": part}, parts={"xl/sharedStrings.xml": strings})
    assert read_workbook(data)[0].rows[0] == ("load", "correction")
    assert read_calibration_table(data, "balance").rows[1].correction == "3"


def test_sheet_is_picked_by_name_where_there_are_several():
    data = workbook(sheets={"Spring": sheet(TABLE), "Autumn": sheet(TABLE), "Empty": sheet([])})
    with pytest.raises(Unacceptable, match="“Spring”, “Autumn”"):
        read_calibration_table(data, "balance")
    assert read_calibration_table(data, "balance", sheet="Autumn").rows


def test_refusal_names_the_cell():
    rows = [*TABLE[:2], [100.0004, "much", 0.16, 2]]
    with pytest.raises(Unacceptable, match="Cell B3"):
        read_calibration_table(workbook(sheets={"S": sheet(rows)}), "balance")


@pytest.mark.parametrize(
    ("old", "new", "says"),
    [
        ("<v>0.2</v>", "<f>A2*2</f><v>0.2</v>", "cell B2 holds a formula"),
        ('<c r="B2"><v>0.2</v>', '<c r="B2" t="e"><v>#REF!</v>', "error value"),
        ('<c r="B2"><v>0.2</v>', '<c r="B2" t="b"><v>1</v>', "truth value"),
        ('<c r="B2"><v>0.2</v>', '<c r="B2" t="s"><v>7</v>', "text that is not there"),
        ('r="B2"', 'r="ZZZ9999999"', "filled as far as"),
        ('r="B2"', 'r="2B"', "has no name"),
        ("<v>0.2</v>", "<v>0,2</v>", "no number"),
        ("<v>0.2</v>", "<v>NaN</v>", "no number"),
        ("<sheetData>", "<!DOCTYPE x><sheetData>", "DOCTYPE"),
        ("</sheetData>", "", "not well-formed"),
    ],
)
def test_cell_that_is_no_value_is_refused(old, new, says):
    part = sheet(TABLE)
    assert old in part
    with pytest.raises(Unacceptable, match=says):
        read_workbook(workbook(sheets={"S": part.replace(old, new, 1)}))


@pytest.mark.parametrize(
    "data",
    [b"PK\x03\x04 no archive", b"", workbook(sheets={}), workbook(sheets={"S": "<a/>"})[:-40]],
)
def test_file_that_is_no_workbook_is_refused(data):
    with pytest.raises(Unacceptable):
        read_workbook(data)


def lying_bomb():
    """Return a workbook whose directory says that its sheet of 30 MB is small."""
    data = bytearray(workbook(sheets={"S": "<a>" + " " * 30_000_000 + "</a>"}))
    size = (30_000_007).to_bytes(4, "little")
    assert size in data
    while size in data:
        at = data.index(size)
        data[at : at + 4] = (900).to_bytes(4, "little")
    return bytes(data)


def hostile():
    """Return workbooks that would take much time or memory, by name."""
    return {
        # a few hundred kilobytes that unpack to 200 MB
        "bomb": workbook(parts={"xl/worksheets/sheet1.xml": " " * 200_000_000}),
        "lying": lying_bomb(),
        "large": workbook(
            sheets={"S": sheet(TABLE)},
            parts={"xl/media/x.bin": "ab" * 2_600_000},
            compression=zipfile.ZIP_STORED,
        ),
        "many cells": workbook(sheets={"S": sheet([[1.5] * 26] * 5000)}),
    }


def test_bombs_are_refused_in_little_time_and_memory(tmp_path, refused_by):
    for name, data in hostile().items():
        path = tmp_path / f"{name}.xlsx"
        path.write_bytes(data)
        seconds, megabytes, says = refused_by(path, "server.intake.workbook", "read_workbook")
        print(name, round(seconds, 3), "s", round(megabytes), "MB", says)
        assert says, name
        assert seconds < 2.0, name
        assert megabytes < 100.0, name


@pytest.mark.parametrize(("index", "name"), [(0, "A"), (25, "Z"), (26, "AA"), (701, "ZZ")])
def test_columns_are_named_by_letters(index, name):
    assert column_name(index) == name
