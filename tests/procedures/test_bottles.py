"""Bottles opened and moved, on both engines."""

import pytest
import sqlalchemy as sa
from sqlalchemy.exc import DBAPIError

from server.lab.refusal import NotAllowed, NotFound, Unacceptable
from server.procedures.bottles import MoveBottle, OpenBottle, move_bottle, open_bottle
from server.procedures.lots import (
    FillBottles,
    MakeUpLot,
    UseUpBottle,
    fill_bottles,
    make_up_lot,
    use_up_bottle,
)
from server.records.tables.lots import Bottle


def row(lab, code):
    return lab.transactions.read(
        lambda session: session.scalar(sa.select(Bottle).where(Bottle.code == code))
    )


def test_bottle_opened_keeps_the_first_time_and_the_trail_both_acts(lab):
    lab.act(open_bottle, OpenBottle(lab.bottle), "analyst")
    first = lab.clock()
    lab.clock.move(days=1)
    lab.act(open_bottle, OpenBottle(lab.bottle.lower()), "second analyst")
    kept = row(lab, lab.bottle)
    assert (kept.opened_at, kept.opened_by) == (first, lab.people["analyst"].person_id)
    assert kept.opened_until is None
    assert [act for _, act, _ in lab.acts()].count("opened a bottle") == 1
    assert lab.chain().holds


def test_lot_that_limits_open_bottles_sets_their_end(sqlite_lab):
    lab = sqlite_lab
    lot = lab.act(make_up_lot, MakeUpLot("HCl", "0.1", opened_days="7"), "analyst")
    (code,) = lab.act(fill_bottles, FillBottles(lot, "Shelf 1", "500"), "analyst")
    lab.act(open_bottle, OpenBottle(code), "analyst")
    until = row(lab, code).opened_until
    assert until.isoformat() == "2026-05-11T22:00:00+00:00"  # 11 May ends at midnight in Berlin


def test_opening_is_never_written_anew(lab):
    lab.act(open_bottle, OpenBottle(lab.bottle), "analyst")
    for value in ("NULL", "1"):
        change = f"UPDATE bottle SET opened_at = {value} WHERE code = '{lab.bottle}'"
        with pytest.raises(DBAPIError, match="opened once"):
            lab.transactions.write(lambda session, change=change: session.execute(sa.text(change)))


def test_bottle_moved_stands_there_and_the_trail_says_where_it_was(lab):
    lab.act(move_bottle, MoveBottle(lab.bottle, " Fume cupboard 2 "), "analyst")
    assert row(lab, lab.bottle).place == "Fume cupboard 2"
    assert lab.acts()[-1][1:] == ("moved a bottle", "bottle")
    lab.act(move_bottle, MoveBottle(lab.bottle, "Fume cupboard 2"), "analyst")
    assert [act for _, act, _ in lab.acts()].count("moved a bottle") == 1
    with pytest.raises(Unacceptable, match="place"):
        lab.act(move_bottle, MoveBottle(lab.bottle, "  "), "analyst")


def test_bottle_used_up_is_neither_opened_nor_moved(sqlite_lab):
    sqlite_lab.act(use_up_bottle, UseUpBottle(sqlite_lab.bottle), "analyst")
    for procedure, command in (
        (open_bottle, OpenBottle(sqlite_lab.bottle)),
        (move_bottle, MoveBottle(sqlite_lab.bottle, "Shelf 2")),
    ):
        with pytest.raises(NotAllowed, match="used up"):
            sqlite_lab.act(procedure, command, "analyst")


@pytest.mark.parametrize("who", ["keeper", "countersigner", "reader", "steward"])
def test_bottle_is_tended_by_analysts_only(sqlite_lab, who):
    for procedure, command in (
        (open_bottle, OpenBottle(sqlite_lab.bottle)),
        (move_bottle, MoveBottle(sqlite_lab.bottle, "Shelf 2")),
    ):
        with pytest.raises(NotAllowed, match="analyst"):
            sqlite_lab.act(procedure, command, who)


def test_unknown_bottle_is_not_found(sqlite_lab):
    with pytest.raises(NotFound):
        sqlite_lab.act(open_bottle, OpenBottle("00000000"), "analyst")
