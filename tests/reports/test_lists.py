"""The lists of the demonstration laboratory as CSV, read back."""

import csv
import io
import re
from dataclasses import replace

from server.reports.csv_export import read_csv_back
from server.reports.lists import (
    instruments_csv,
    lots_csv,
    shelf_csv,
    standard_lots_csv,
    trail_csv,
)
from server.sheets.instruments_page import open_instruments
from server.sheets.lots_page import open_lots
from server.sheets.shelf_page import open_shelf
from server.sheets.stores_page import open_stores
from server.sheets.trail_list import open_trail_list


def table(data):
    heads, *rows = read_csv_back(data)
    return [dict(zip(heads, row, strict=True)) for row in rows]


def raw(data):
    return list(csv.reader(io.StringIO(data.decode("utf-8-sig"), newline="")))


def read(laboratory, opened, **more):
    return laboratory.read(lambda session, **who: opened(session, **more, **who))


def test_shelf_tells_number_and_unit_apart_and_none_out_of_force(laboratory):
    shelf = read(laboratory, open_shelf, words="", state="")
    rows = table(shelf_csv(shelf))
    assert len(rows) == len(shelf.bottles)
    for row, bottle in zip(rows, shelf.bottles, strict=True):
        assert row["bottle"] == bottle.code
        assert row["as certified"] == bottle.reported
        assert (row["value"] != "") is bottle.in_force
        if bottle.in_force:
            assert bottle.reported.startswith(f"{row['value']} ± {row['U']} mol/L (k = {row['k']}")
            assert re.fullmatch(r"\d{4}-\d\d-\d\d", row["good until"])
    assert any(row["value"] for row in rows)


def test_shelf_keeps_the_filter_of_its_page(laboratory):
    shelf = read(laboratory, open_shelf, words="hcl", state="")
    assert {row["titrant"] for row in table(shelf_csv(shelf))} == {"HCl"}


def test_standard_lots_tell_what_is_left_as_a_number(laboratory):
    rows = table(standard_lots_csv(read(laboratory, open_stores)))
    assert [row["substance"] for row in rows] == ["KHP", "TRIS"]
    assert 40 < float(rows[0]["left, g"]) < 60
    assert rows[1]["set by"].startswith("period after opening, 9 months from ")


def test_lots_and_instruments_are_all_there(laboratory):
    lots = read(laboratory, open_lots, state="")
    assert [row["lot"] for row in table(lots_csv(lots))] == [one.code for one in lots.lots]
    page = read(laboratory, open_instruments)
    rows = table(instruments_csv(page.instruments))
    assert [row["instrument"] for row in rows] == [one.name for one in page.instruments]


def test_trail_is_whole_and_its_days_filter(laboratory):
    lines = read(laboratory, open_trail_list, person="", thing="", day="")
    rows = table(trail_csv(lines))
    numbers = [int(row["number"]) for row in rows]
    assert numbers == list(range(len(lines), 0, -1))
    of_keeper = read(laboratory, open_trail_list, person="Jonas Halework", thing="", day="")
    assert {row["who"] for row in table(trail_csv(of_keeper))} == {"Jonas Halework"}


def test_names_that_a_spreadsheet_might_run_are_guarded_in_every_list(laboratory):
    evil = "=HYPERLINK(1)"
    shelf = read(laboratory, open_shelf, words="", state="")
    bottle = replace(shelf.bottles[0], lot_name=evil, place=evil, nominal=f"{evil} mol/L")
    stores = read(laboratory, open_stores)
    lot = replace(stores.standard_lots[0], name=evil, issuer=evil, left=f"{evil} g")
    lots = read(laboratory, open_lots, state="")
    line = replace(read(laboratory, open_trail_list, person="", thing="", day="")[0], why=evil)
    instrument = replace(read(laboratory, open_instruments).instruments[0], name=evil, says=evil)
    for data in (
        shelf_csv(replace(shelf, bottles=(bottle,))),
        standard_lots_csv(replace(stores, standard_lots=(lot,))),
        lots_csv(replace(lots, lots=(replace(lots.lots[0], name=evil, made_by=evil),))),
        trail_csv([line]),
        instruments_csv([instrument]),
    ):
        cells = [cell for row in raw(data) for cell in row]
        assert f"'{evil}" in cells
        assert not any(cell.startswith("=") for cell in cells)
