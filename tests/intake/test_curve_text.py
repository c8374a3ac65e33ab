"""Curves from text: what is recognised, what is refused, and the cell that a refusal names."""

from decimal import Decimal

import pytest

from server.intake.curve_columns import (
    ColumnMapping,
    RememberedColumns,
    mapping_from,
    remembered_from,
)
from server.intake.curve_table import Asked, Drop
from server.intake.curve_text import MOST_BYTES, read_curve_text
from server.intake.kept_files import sha256_of
from server.lab.refusal import Unacceptable

VOLUMES = ("0.00", "5.00", "10.00", "15.00", "20.00", "20.50", "21.00", "22.00")
READINGS = ("4.01", "4.80", "5.30", "5.62", "6.20", "8.40", "10.90", "11.30")


def table(separator=";", *, comma=False, header=None, rows=None):
    lines = [] if header is None else [header]
    for cells in rows or zip(VOLUMES, READINGS, strict=True):
        line = separator.join(cells)
        lines.append(line.replace(".", ",") if comma else line)
    return "\n".join(lines) + "\n"


def refusal(text, **more):
    with pytest.raises(Unacceptable) as caught:
        read_curve_text(text, **more)
    return caught.value.says


@pytest.mark.parametrize(
    ("separator", "comma", "word"),
    [
        (",", False, "comma"),
        (";", False, "semicolon"),
        (";", True, "semicolon"),
        ("\t", False, "tab"),
        ("\t", True, "tab"),
        ("  ", False, "spaces"),
        ("  ", True, "spaces"),
    ],
)
def test_curve_text_every_separator_gives_the_same_digits(separator, comma, word):
    read = read_curve_text(table(separator, comma=comma))
    assert read.volume_mL == VOLUMES
    assert read.reading == READINGS
    assert read.kind == "pH"
    assert f"Separator: {word}; decimal {'comma' if comma else 'point'}." in read.says


def test_curve_text_quoted_decimal_commas_between_commas_are_read():
    text = "".join(
        f'"{v}","{y}"\n'.replace(".", ",") for v, y in zip(VOLUMES, READINGS, strict=True)
    )
    assert read_curve_text(text).volume_mL == VOLUMES


def test_curve_text_bare_decimal_commas_between_commas_are_refused():
    text = "".join(f"{v},{y}\n".replace(".", ",") for v, y in zip(VOLUMES, READINGS, strict=True))
    assert "cannot be told apart" in refusal(text)


def test_curve_text_whole_numbers_between_commas_are_told_by_the_header():
    rows = [(str(at), str(100 + at), str(at), "1") for at in range(8)]
    read = read_curve_text(table(",", header="volume (mL),mV,time (s),run", rows=rows))
    assert read.seconds == tuple(map(str, range(8)))


@pytest.mark.parametrize(
    ("header", "kind", "first"),
    [
        ("volume (mL);pH", "pH", "5.00"),
        ("V/mL;pH", "pH", "5.00"),
        ("Volume [µL];pH", "pH", "0.00500"),
        ("titrant volume, L;pH value", "pH", "5000.00"),
        ("volume ml;potential (mV)", "mV", "5.00"),
        ("mL;E/mV", "mV", "5.00"),
        ("NaOH added (mL);ORP", "mV", "5.00"),
    ],
)
def test_curve_text_header_tells_columns_and_units(header, kind, first):
    read = read_curve_text(table(header=header))
    assert read.kind == kind
    assert read.volume_mL[1] == first
    assert any(one.startswith("Taken: volume in") for one in read.says)


def test_curve_text_columns_in_any_order_are_found_by_name():
    rows = [(y, "x", str(at), v) for at, (v, y) in enumerate(zip(VOLUMES, READINGS, strict=True))]
    read = read_curve_text(table(header="pH;note;time (min);volume (mL)", rows=rows))
    assert (read.volume_mL, read.reading) == (VOLUMES, READINGS)
    assert read.seconds == tuple(str(60 * at) for at in range(len(VOLUMES)))
    assert read.mapping == ColumnMapping(3, 0, "pH", 2, time_unit="min")
    assert any("“note”" in one for one in read.says)


def test_curve_text_first_column_of_words_is_found_by_mapping():
    rows = [("A", v, y) for v, y in zip(VOLUMES, READINGS, strict=True)]
    with pytest.raises(Unacceptable):
        read_curve_text(table(rows=rows))


def test_curve_text_without_header_takes_large_readings_for_mV():
    rows = [(v, str(100 + 10 * at)) for at, v in enumerate(VOLUMES)]
    read = read_curve_text(table(rows=rows))
    assert read.kind == "mV"
    assert "No header" in read.says[1]


def test_curve_text_volts_become_millivolts():
    rows = [(v, f"0.{300 + at}") for at, v in enumerate(VOLUMES)]
    read = read_curve_text(table(header="volume (mL);potential (V)", rows=rows))
    assert read.reading[0] == "300.000"


def test_curve_text_third_column_without_header_is_seconds():
    rows = [(v, y, str(at)) for at, (v, y) in enumerate(zip(VOLUMES, READINGS, strict=True))]
    assert read_curve_text(table(rows=rows)).seconds == tuple(map(str, range(8)))


def test_curve_text_comments_blank_lines_and_a_preamble_are_passed_over():
    text = "Instrument 7\nOperator;M\n\n# a remark\n" + table(header="volume (mL);pH")
    read = read_curve_text(text)
    assert read.volume_mL == VOLUMES
    assert read.rows[0] == 6
    assert "2 lines before the table passed over." in read.says


def test_curve_text_keeps_the_hash_of_the_bytes_that_came():
    data = table().encode("utf-16")
    read = read_curve_text(data)
    assert read.sha256 == sha256_of(data)
    assert read.reading == READINGS


def test_curve_text_mapping_that_a_person_set_is_used_instead_of_the_header():
    rows = [("9", y, v) for v, y in zip(VOLUMES, READINGS, strict=True)]
    mapping = mapping_from(ColumnMapping(2, 1, "pH").to_document())
    read = read_curve_text(table(header="a;b;c", rows=rows), asked=Asked(mapping=mapping))
    assert (read.volume_mL, read.reading) == (VOLUMES, READINGS)
    assert "Columns as you set them." in read.says


@pytest.mark.parametrize(
    ("header", "taken"), [("A ; pH2;level;", True), ("level;pH2;A", False), (None, False)]
)
def test_curve_text_remembered_columns_count_only_where_the_same_header_comes(header, taken):
    rows = [("9", y, v) for v, y in zip(VOLUMES, READINGS, strict=True)]
    kept = RememberedColumns(ColumnMapping(2, 1, "pH"), ("a", "pH2", "level"), 3)
    asked = Asked(remembered=remembered_from(kept.to_document()))
    if taken:
        read = read_curve_text(table(header=header, rows=rows), asked=asked)
        assert (read.volume_mL, read.mapping) == (VOLUMES, kept.mapping)
        assert "Columns as in this instrument's last file." in read.says
        return
    rows = list(zip(VOLUMES, READINGS, map(str, range(8)), strict=True))
    if header is not None:  # nothing in it names a volume
        assert "No column is named as the volume" in refusal(table(header=header), asked=asked)
    else:
        assert read_curve_text(table(rows=rows), asked=asked).mapping.volume == 0


def test_curve_text_mapping_beyond_the_table_is_refused():
    asked = Asked(mapping=ColumnMapping(0, 7, "pH"))
    assert refusal(table(), asked=asked) == "Column 8 is asked for; the table has 2."


def test_curve_text_bad_row_is_pointed_at_and_can_be_left_out_by_hand():
    text = table().replace("20.50;8.40", "20.50;err")
    with pytest.raises(Unacceptable) as caught:
        read_curve_text(text)
    assert (caught.value.shown["row"], caught.value.shown["column"]) == (6, 2)
    assert caught.value.shown["mapping"]["reading"] == 1
    assert caught.value.shown["table"]["rows"][0] == {"row": 1, "cells": ["0.00", "4.01"]}
    read = read_curve_text(text, asked=Asked(leave_out=(6,)))
    assert len(read.volume_mL) == len(VOLUMES) - 1
    assert (read.set_aside[0].row, "“err”" in read.set_aside[0].says) == (6, True)


@pytest.mark.parametrize(("row", "says"), [(3, "holds numbers"), (99, "none of the table's rows")])
def test_curve_text_reading_is_not_left_out_by_hand(row, says):
    assert says in refusal(table(), asked=Asked(leave_out=(row,)))


def test_curve_text_with_more_points_than_are_kept_is_refused():
    says = refusal(table(), asked=Asked(most_points=7))
    assert "8 rows" in says
    assert "at most 7 points" in says


@pytest.mark.parametrize(
    ("rows", "says"),
    [
        ([("1", "2", *("3",) * 49)] * 8, "51 columns; at most 50"),
        ([("1", "x" * 10_001)] * 8, "Row 1 has 10003 characters; at most 10000"),
    ],
)
def test_curve_text_too_wide_is_refused(rows, says):
    assert says in refusal(table(rows=rows))


def test_curve_text_with_too_many_rows_is_refused():
    assert "more than 200000 rows" in refusal("1;2\n" * 200_001)


@pytest.mark.parametrize(
    ("document", "field"),
    [
        ({"volume": 0, "reading": 0, "kind": "pH"}, "mapping.reading"),
        ({"volume": -1, "reading": 1, "kind": "pH"}, "mapping.volume"),
        ({"volume": 0, "reading": 1, "kind": "redox"}, "mapping.kind"),
        ({"volume": 0, "reading": 1, "kind": "pH", "reading_unit": "mV"}, "mapping.reading_unit"),
        ({"volume": 0, "reading": 1, "kind": "pH", "colour": 1}, "mapping.colour"),
        ({"volume": 0, "reading": 1, "kind": "pH", "time_unit": []}, "mapping.time_unit"),
        ({"volume": 0, "reading": 1, "kind": ["pH"]}, "mapping.kind"),
    ],
)
def test_column_mapping_that_cannot_be_is_refused_by_its_field(document, field):
    with pytest.raises(Unacceptable) as caught:
        mapping_from(document)
    assert caught.value.field == field


def test_curve_text_drops_become_volumes_with_one_shared_uncertainty():
    rows = [(str(at), y) for at, y in enumerate(READINGS)]
    drop = Drop(Decimal("0.0487"), Decimal("0.0002"))
    read = read_curve_text(table(header="drops;pH", rows=rows), asked=Asked(drop=drop))
    assert read.volume_mL[:3] == ("0.0000", "0.0487", "0.0974")
    assert read.relative_u_volume == pytest.approx(0.0002 / 0.0487)


def test_curve_text_drops_without_the_volume_of_one_are_refused():
    rows = [(str(at), y) for at, y in enumerate(READINGS)]
    with pytest.raises(Unacceptable) as caught:
        read_curve_text(table(header="drop count;pH", rows=rows))
    assert caught.value.field == "drop_mL"


@pytest.mark.parametrize(
    ("cell", "says"),
    [
        ("abc", "Row 4, column 2: “abc” is not a number."),
        ("", "Row 4, column 2 is empty"),
        ("=B2+1", "Row 4, column 2: “=B2+1” is a formula"),
        ("@SUM(B1)", "is a formula"),
        ("-cmd(1)", "is a formula"),
        ("nan", "“nan” is not a number"),
        ("1e999", "is not a number"),
        ("1" * 60, "is not a number"),
    ],
)
def test_curve_text_cell_that_is_no_number_is_named_by_row_and_column(cell, says):
    rows = [list(one) for one in zip(VOLUMES, READINGS, strict=True)]
    rows[2][1] = cell
    assert says in refusal(table(header="volume (mL);pH", rows=rows))


def test_curve_text_row_that_is_short_is_named():
    rows = [list(one) for one in zip(VOLUMES, READINGS, strict=True)]
    rows[3] = rows[3][:1]
    assert "Row 4, column 2 is empty" in refusal(table(rows=rows))


def test_curve_text_decimal_marks_of_both_kinds_are_refused_with_both_places():
    rows = [list(one) for one in zip(VOLUMES, READINGS, strict=True)]
    rows[4][0] = "20,00"
    said = refusal(table(rows=rows))
    assert "row 5, column 1" in said
    assert "row 1, column 1" in said


def test_curve_text_fewer_than_six_points_are_refused():
    rows = list(zip(VOLUMES, READINGS, strict=True))[:5]
    assert "5 points; a curve needs at least 6" in refusal(table(rows=rows))


@pytest.mark.parametrize("wrong", ["2.00", "200.00"])
def test_curve_text_one_volume_out_of_order_is_pointed_at_and_left_out(wrong):
    rows = [list(one) for one in zip(VOLUMES, READINGS, strict=True)]
    rows[3][0] = wrong
    read = read_curve_text(table(header="volume (mL);pH", rows=rows))
    assert [one.row for one in read.set_aside] == [5]
    assert "Row 5, column 1" in read.set_aside[0].says
    assert wrong not in read.volume_mL
    assert read.points().volume_mL == tuple(float(v) for v in VOLUMES if v != "15.00")


def test_curve_text_two_curves_in_one_file_are_refused():
    rows = list(zip(VOLUMES, READINGS, strict=True)) * 2
    assert "Row 9, column 1: the volume 0.00 is below the one before it" in refusal(
        table(rows=rows)
    )


def test_curve_text_time_that_goes_back_is_refused():
    seconds = ["0", "10", "20", "15", "40", "50", "60", "70"]
    rows = list(zip(VOLUMES, READINGS, seconds, strict=True))
    assert "Row 4, column 3: the time goes back." in refusal(table(rows=rows))


@pytest.mark.parametrize(
    ("text", "says"),
    [
        ("", "no table"),
        ("# nothing\n", "no table"),
        ("volume;pH\n", "No row with two numbers"),
        ("1\n2\n3\n", "No separator"),
        ("0.0;4.0\x00\n", "characters that no text has"),
        ('"0.0;4.0\n1;2\n', "quotation marks"),
        ("0;" * 60 + "1\n" + "1;2\n" * 8, "columns; at most 50"),
        ("0;" + "1" * 10_001 + "\n", "characters; at most 10000"),
        ("0;4\n" * 200_501, "more than"),
        (b"0;4\n" * (MOST_BYTES // 4 + 1), "MB; at most 5 MB"),
    ],
)
def test_curve_text_that_is_no_table_or_too_large_is_refused_in_words(text, says):
    assert says in refusal(text)


def test_curve_text_header_without_a_volume_says_what_it_has():
    assert "the header has “alpha”, “pH”" in refusal(table(header="alpha;pH"))


@pytest.mark.parametrize("seed", range(10))
def test_curve_text_of_any_kind_is_read_or_refused_in_words(seed):
    import random

    rng = random.Random(seed)
    marks = [*'01;, \t\n\n#"−(/é', "2.5", "3,5", "pH", "mL", "=A1", "e9"]
    for _ in range(200):
        text = "".join(rng.choice(marks) for _ in range(rng.randrange(120)))
        try:
            read = read_curve_text(text)
        except Unacceptable as problem:
            said, points = problem.says, 0
        else:
            said, points = "", len(read.volume_mL)
        assert said.endswith(".") or points >= 6


@pytest.mark.parametrize(
    ("cell", "says"),
    [
        ("77", "Row 6, column 2: 77 pH is not possible on a curve (-3 to 17 pH)."),
        ("1e99", "Row 6, column 2: “1e99” is too large or too small to be a reading."),
        ("1e-60", "Row 6, column 2: “1e-60” is too large or too small to be a reading."),
    ],
)
def test_curve_text_reading_that_cannot_be_is_named_and_can_be_left_out(cell, says):
    text = table(header="mL;pH").replace("20.00;6.20", f"20.00;{cell}")
    assert refusal(text) == says
    assert len(read_curve_text(text, asked=Asked(leave_out=(6,))).rows) == len(VOLUMES) - 1


def test_curve_text_volume_below_zero_is_refused():
    assert "-0.10 mL is not possible" in refusal(table().replace("0.00;", "-0.10;", 1))


def test_curve_text_numbers_with_all_digits_of_a_double_are_taken_as_they_stand():
    # what a script or a worksheet writes for 3 * 0.05, and for nothing with noise on it
    text = table(header="mL;pH").replace("20.00;", "20.000000000000004;")
    text = text.replace("0.00;", "4.4408920985006262E-16;", 1)
    read = read_curve_text(text)
    assert read.volume_mL[0] == "0.00000000000000044408920985006262"
    assert "20.000000000000004" in read.volume_mL


@pytest.mark.parametrize(("unit", "factor"), [("pH", 1), ("mV", -60)])
def test_curve_text_without_header_whose_first_column_counts_takes_the_second(unit, factor):
    plain = table(header=None)
    points = [line.split(";") for line in plain.splitlines()]
    rows = [f"{at};{V};{float(y) * factor:.2f}" for at, (V, y) in enumerate(points, start=1)]
    read = read_curve_text("\n".join(rows))
    assert (read.kind, read.seconds) == (unit, None)
    assert read.volume_mL == read_curve_text(plain).volume_mL
    assert read.says[-1] == (
        "No header: column 1 counts the points, column 2 taken as the volume in mL, "
        f"column 3 as {unit}."
    )


def test_curve_text_without_header_of_whole_millilitres_keeps_its_seconds():
    rows = [f"{at};{4 + at / 10:.2f};{3 * at}" for at in range(30)]
    read = read_curve_text("\n".join(rows))
    assert read.volume_mL[3] == "3"
    assert read.seconds[3] == "9"
