"""Lists as CSV: harmless in a spreadsheet, exact on the way back."""

import csv
import io

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from server.reports.csv_export import guarded, read_csv_back, write_csv

# OWASP ASVS 5.0, 1.2.10: = + - @ tab and NUL begin what a spreadsheet may run
DANGEROUS = ["=1+1", "+1", "-1", "@SUM(A1)", "\tx", "\rx", "\x00x", " =1+1", "＝1", "-0.0003",
             "'=1", "''-1"]  # fmt: skip


def rows_of(data):
    return list(csv.reader(io.StringIO(data.decode("utf-8-sig"), newline="")))


@pytest.mark.parametrize("cell", DANGEROUS)
def test_text_that_a_spreadsheet_might_run_is_guarded_and_comes_back(cell):
    data = write_csv(["name"], [[cell]])
    assert rows_of(data)[1][0][0] == "'"
    assert read_csv_back(data) == [["name"], [cell]]


def test_true_numbers_stay_numbers_in_their_columns_only():
    data = write_csv(["error, g", "remark"], [["-0.0003", "-0.0003"]], numeric=["error, g"])
    assert rows_of(data)[1] == ["-0.0003", "'-0.0003"]


@pytest.mark.parametrize("cell", ["-1+cmd", "=2", "-0,5", "-0.5 ", "−1", "-", "1e9999"])
def test_numeric_column_lets_nothing_else_through(cell):
    shown = rows_of(write_csv(["n"], [[cell]], numeric=["n"]))[1][0]
    assert shown == (f"'{cell}" if cell[0] in "=-" else cell)


def test_ordinary_text_is_left_alone():
    cells = ["Balance B-2", "0.3888", "18.60", "a, b", 'say "no"', "two\nlines", "it's", "'quoted'"]
    data = write_csv([f"c{i}" for i in range(len(cells))], [cells])
    assert rows_of(data)[1] == cells
    assert data.startswith(b"\xef\xbb\xbf")
    assert data.endswith(b"\r\n")


@settings(deadline=None)
@given(st.lists(st.lists(st.text(), min_size=2, max_size=2), max_size=6))
def test_any_text_comes_back_as_it_was(rows):
    data = write_csv(["a", "n"], rows, numeric=["n"])
    assert read_csv_back(data)[1:] == rows


@settings(deadline=None)
@given(st.text())
def test_no_guarded_cell_begins_as_a_formula(cell):
    assert guarded(cell)[:1] not in set("=+-@\t\r\x00") - {""}


def test_rows_that_do_not_fit_are_refused():
    with pytest.raises(ValueError, match="2 cells for 1"):
        write_csv(["a"], [["b", "c"]])
    with pytest.raises(ValueError, match="no such heading"):
        write_csv(["a"], [], numeric=["b"])
