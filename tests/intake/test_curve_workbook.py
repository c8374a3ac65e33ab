"""Curves from workbooks, written part by part (ECMA-376)."""

import contextlib
import io
import random
import zipfile

import pytest

from server.intake.curve_workbook import read_curve_file
from server.lab.refusal import Unacceptable

_MAIN = "http://schemas.openxmlformats.org/spreadsheetml/2006/main"
_OFFICE = "http://schemas.openxmlformats.org/officeDocument/2006/relationships"
_PACKAGE = "http://schemas.openxmlformats.org/package/2006/relationships"
ROWS = [
    ["volume (mL)", "pH"],
    [0.0, 4.01], [5.0, 4.80], [10.0, 5.30], [20.0, 6.20], [20.5, 8.40], [21.0, 10.90], [22.0, 11.3],
]  # fmt: skip


def cell(name, value):
    if isinstance(value, str) and value.startswith("="):
        return f'<c r="{name}"><f>{value[1:]}</f><v>1</v></c>'
    if isinstance(value, str):
        return f'<c r="{name}" t="inlineStr"><is><t>{value}</t></is></c>'
    return f'<c r="{name}"><v>{value!r}</v></c>'


def workbook(rows=ROWS, *, sheets=("Curve",), parts=None):
    lines = "".join(
        f'<row r="{r}">'
        + "".join(cell(f"{chr(65 + c)}{r}", value) for c, value in enumerate(row))
        + "</row>"
        for r, row in enumerate(rows, start=1)
    )
    sheet = f'<worksheet xmlns="{_MAIN}"><sheetData>{lines}</sheetData></worksheet>'
    names = "".join(
        f'<sheet name="{name}" sheetId="{i}" r:id="rId{i}"/>' for i, name in enumerate(sheets, 1)
    )
    links = "".join(
        f'<Relationship Id="rId{i}" Type="{_OFFICE}/worksheet" Target="worksheets/sheet{i}.xml"/>'
        for i in range(1, len(sheets) + 1)
    )
    held = {
        "xl/workbook.xml": f'<workbook xmlns="{_MAIN}" xmlns:r="{_OFFICE}"><sheets>{names}</sheets>'
        "</workbook>",
        "xl/_rels/workbook.xml.rels": f'<Relationships xmlns="{_PACKAGE}">{links}</Relationships>',
        **{f"xl/worksheets/sheet{i}.xml": sheet for i in range(1, len(sheets) + 1)},
        **(parts or {}),
    }
    buffer = io.BytesIO()
    with zipfile.ZipFile(buffer, "w", zipfile.ZIP_DEFLATED) as archive:
        for name, part in held.items():
            archive.writestr(name, part)
    return buffer.getvalue()


def refusal(data, **more):
    with pytest.raises(Unacceptable) as caught:
        read_curve_file(data, **more)
    return caught.value.says


def test_curve_workbook_is_read_like_a_text():
    read = read_curve_file(workbook())
    text = read_curve_file("\n".join(";".join(map(str, row)) for row in ROWS).encode())
    assert read.points() == text.points()
    assert read.says[0] == "Sheet “Curve”."


def test_curve_workbook_formula_is_refused_by_its_cell():
    rows = [*ROWS[:3], [10.0, "=B3+0.5"], *ROWS[4:]]
    said = refusal(workbook(rows))
    assert "Cell B4: “=B3+0.5” is a formula" in said


def test_curve_workbook_formula_beside_the_curve_is_passed_over():
    rows = [[*ROWS[0], "mV"], *([*row, f"=B{at}*59"] for at, row in enumerate(ROWS[1:], start=2))]
    assert read_curve_file(workbook(rows)).points() == read_curve_file(workbook()).points()


def test_curve_workbook_of_formulas_alone_is_refused_by_its_cell():
    rows = [ROWS[0], *([row[0], f"=C{at}"] for at, row in enumerate(ROWS[1:], start=2))]
    assert "Cell B2: “=C2” is a formula" in refusal(workbook(rows))


@pytest.mark.parametrize(
    ("parts", "says"),
    [
        ({"xl/vbaProject.bin": "x"}, "macros"),
        ({f"xl/media/{at}.xml": "x" for at in range(200)}, "unpack to more than is read"),
        ({"xl/media/a.xml": " " * 51_000_000}, "unpack to more than is read"),
        ({"xl/media/a.xml": " " * 2_000_000}, "far more than it holds"),
    ],
)
def test_curve_workbook_beyond_the_bounds_is_refused_by_its_directory(parts, says):
    assert says in refusal(workbook(parts=parts))


def test_curve_workbook_larger_than_five_megabytes_is_refused():
    assert "at most 5 are read" in refusal(workbook() + bytes(5_000_000))


def test_curve_workbook_word_among_the_numbers_is_refused_by_its_cell():
    rows = [*ROWS[:3], [10.0, "about five"], *ROWS[4:]]
    assert "Cell B4: “about five” is not a number." in refusal(workbook(rows))


def test_curve_workbook_with_two_sheets_asks_for_the_name():
    data = workbook(sheets=("One", "Two"))
    assert "“One”, “Two”" in refusal(data)
    assert read_curve_file(data, sheet="Two").points().volume_mL[0] == 0.0


def test_curve_workbook_bomb_is_refused_before_it_is_unpacked():
    part = f'<worksheet xmlns="{_MAIN}"><sheetData>{" " * 9_000_000}</sheetData></worksheet>'
    said = refusal(workbook(parts={"xl/worksheets/sheet1.xml": part}))
    assert "unpack" in said


def test_curve_workbook_doctype_is_refused():
    part = f'<!DOCTYPE x [<!ENTITY a "b">]><workbook xmlns="{_MAIN}"/>'
    assert "DOCTYPE" in refusal(workbook(parts={"xl/workbook.xml": part}))


def test_curve_file_of_the_old_binary_kind_is_refused_in_words():
    assert "old binary kind" in refusal(b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1" + bytes(600))


def test_curve_workbook_damaged_at_any_place_is_read_or_refused_in_words():
    whole, chance = workbook(), random.Random(5)
    for _ in range(400):
        data = bytearray(whole)
        for _ in range(chance.randint(1, 6)):
            data[chance.randrange(4, len(data))] = chance.randrange(256)
        with contextlib.suppress(Unacceptable):  # anything else would be a failure
            read_curve_file(bytes(data))
