"""Calibration tables from CSV text: recognised, signed, refused by row and column."""

import pytest

from server.intake.calibration_table import read_calibration_table
from server.lab.papers import read_calibration
from server.lab.refusal import Unacceptable


def read(text, kind="balance", **asked):
    return read_calibration_table(text.encode() if isinstance(text, str) else text, kind, **asked)


def pairs(table):
    return [(one.reading, one.correction) for one in table.rows]


def test_correction_is_taken_as_it_stands():
    table = read("load (g),correction (g)\n50.0000,-0.0002\n100.0000,0.0004\n")
    assert pairs(table) == [("50.0000", "-0.0002"), ("100.0000", "0.0004")]
    assert "A reading of 100.0000 g is then taken as 100.0004 g." in table.says
    assert table.sign.startswith("correction")


def test_error_is_turned_into_its_opposite_and_keeps_its_zeros():
    table = read("indication; error of indication\n50; 0.00020\n100;-0.00040\n200;0.00000")
    assert pairs(table) == [("50", "-0.00020"), ("100", "0.00040"), ("200", "0.00000")]
    assert table.sign.startswith("error of indication")


def test_reference_gives_the_correction_itself():
    table = read("indication, mg\treference, g\n50000.2\t50.00002\n100000.4\t100.00003")
    assert pairs(table) == [("50.0002", "-0.00018"), ("100.0004", "-0.00037")]


def test_decimal_comma_semicolon_and_units_are_recognised():
    table = read("load, g;error, mg;U, mg;k\n50,0;0,20;0,10;2\n100,0;-0,40;0,16;2\n")
    assert pairs(table) == [("50.0", "-0.00020"), ("100.0", "0.00040")]
    assert [one.u for one in table.rows] == ["0.00005", "0.00008"]
    assert any("semicolon; decimal comma" in one for one in table.says)
    assert table.fragment["error_u"] == {"unit": "g", "u": "0.00008"}


def test_coverage_factor_may_stand_in_the_header():
    table = read("load (g);correction (mg);U (k = 2) (mg)\n50;0.1;0.2\n100;0.2;0.3")
    assert [one.u for one in table.rows] == ["0.0001", "0.00015"]


def test_fragment_is_what_papers_take():
    table = read("load, g;correction, g;u, g\n50;0.0001;0.00005\n100;0.0002;0.00006")
    assert table.fragment["error_table"][0] == ["0", "0"]
    linearity = {"unit": "g", "half_width": "0.0001", "shape": "rectangular"}
    assert read_calibration("balance", {"linearity": linearity, **table.fragment})
    burette = read("reading (mL);delivered (mL);u (µL)\n0;0;4\n10;10.008;4\n20;19.996;5", "burette")
    assert burette.fragment["error_table"] == [["0", "0"], ["10", "0.008"], ["20", "-0.004"]]
    assert burette.fragment["delivery"] == {"unit": "mL", "u": "0.005"}
    capacity = {"capacity": {"value": "20", "unit": "mL"}}
    assert read_calibration("burette", {**capacity, **burette.fragment})


def test_error_beside_reference_must_agree_with_it():
    good = "indication (g);reference (g);error (mg)\n50.0002;50.0000;0.2\n100.0004;100.0001;0.3"
    assert pairs(read(good)) == [("50.0002", "-0.0002"), ("100.0004", "-0.0003")]
    with pytest.raises(Unacceptable, match=r"Row 3.*opposite"):
        read(good.replace("0.3", "-0.3"))


def test_person_may_say_what_a_column_means():
    text = "load (g);error (g)\n50;0.0002\n100;0.0004"
    assert pairs(read(text, means="correction")) == [("50", "0.0002"), ("100", "0.0004")]
    assert pairs(read(text, means="error")) == [("50", "-0.0002"), ("100", "-0.0004")]


def test_comments_blank_lines_and_unknown_columns_are_passed_over_but_told():
    table = read("# B-2, spring\n\nload;correction;mood\n50;0.0001;good\n100;0.0002;bad\n")
    assert len(table.rows) == 2
    assert any("mood" in one for one in table.says)
    assert any("names no unit; g is taken" in one for one in table.says)


@pytest.mark.parametrize(
    ("data", "kind"),
    [
        ("reading, °C;correction, °C\n10;0.1\n20;0.2".encode("cp1252"), "thermometer"),
        ("reading, °C;correction, K\n10;0.1\n20;0.2".encode("utf-16"), "thermometer"),
        ("\ufeffload, g;correction, µg\n10;100\n20;200".encode(), "balance"),
    ],
)
def test_encodings_of_spreadsheets_are_read(data, kind):
    table = read(data, kind)
    assert [float(one.correction) for one in table.rows] in ([0.1, 0.2], [0.0001, 0.0002])


@pytest.mark.parametrize(
    ("text", "says"),
    [
        ("", "no table"),
        ("50,0.1\n100,0.2", "Row 1 is numbers"),
        ("load,correction\n50,0.1", "at least two rows"),
        ("load,correction\n50,0.1\n40,0.2", "Row 3.*must rise"),
        ("load,correction\n50,0.1\n100,abc", "Row 3, column 2.*“abc” is not a number"),
        ("load,correction\n50,0.1\n100,=1+1", "Row 3, column 2.*formula"),
        ("load,correction\n50,0.1\n100,@x", "Row 3, column 2.*formula"),
        ("load,correction\n50,0.1\n100,", "Row 3, column 2: the correction is missing"),
        ("load,correction\n50,0.1\n100,0.2,7", "Row 3 has 3 cells"),
        ("load,correction,load\n50,0.1,1\n100,0.2,2", "Row 1, column 3.*already"),
        ("load (lb),correction (g)\n50,0.1\n100,0.2", "Row 1, column 1: “lb” is no unit"),
        ("colour,correction\nred,0.1\nblue,0.2", "No column holds the readings.*colour"),
        ("load,colour\n1,red\n2,blue", "No column tells the error.*colour"),
        ("load,correction,U\n50,0.1,0.1\n100,0.2,0.1", "Row 2, column 3: U is stated without"),
        ("load,correction,u\n50,0.1,-0.1\n100,0.2,0.1", "Row 2, column 3: u must be above"),
        ("load;correction\n50.0;0,1\n100,0;0,2", "decimal point and some a decimal comma"),
        ('load,correction\n50,"0.1\n100,0.2', "Row 2 cannot be read"),
        ("load,correction\n50,1e40\n100,0.2", "Row 2, column 2"),
        ("load,correction\n50,nan\n100,0.2", "“nan” is not a number"),
        ("load correction\n50 0.1", "No separator"),
        ("load,correction\n50\x00,0.1\n100,0.2", "characters that no text has"),
        ("load,correction\n" + "9" * 300 + ",1\n100,0.2", "Row 2, column 1 has 300 characters"),
        ("load,correction\n" + "1,1\n" * 1001, "at most 1000"),
        ("x" * 1_000_001, "at most 1 MB"),
        ("reading (K);correction\n283;0.1\n293;0.2", "no unit"),
    ],
)  # fmt: skip
def test_table_that_cannot_be_is_refused_by_row_and_column(text, says):
    kind = "thermometer" if "(K)" in text else "balance"
    with pytest.raises(Unacceptable, match=says):
        read(text, kind)


def test_kind_nobody_tabulates_is_refused():
    with pytest.raises(Unacceptable, match="one of balance, burette, thermometer"):
        read("load,correction\n1,1\n2,2", "clock")
