"""The bench's start, and what a new sheet will rest on."""

import pytest
import sqlalchemy as sa

from server.lab.refusal import NotAllowed, NotFound, NotSignedIn
from server.procedures.lots import MakeUpLot, make_up_lot
from server.records.tables.lots import Lot
from server.sheets.bench_home import open_begin, open_bench_home


def lot_code(demo, titrant: str) -> str:
    asked = sa.select(Lot.code).where(Lot.titrant == titrant).order_by(Lot.made_at)
    return demo.transactions.read(lambda s: s.scalars(asked).first())


def test_home_parts_own_sheets_from_those_of_others(demo) -> None:
    home = demo.read(open_bench_home, who="bashir")
    assert [(line.number, line.state) for line in home.mine] == [("S-2026-0010", "open")]
    others = {line.number: line for line in home.others}
    assert {number: line.state for number, line in others.items()} == {
        "S-2026-0006": "sent back",
        "S-2026-0009": "open",
    }
    assert "Titrate one more" in others["S-2026-0006"].says
    assert home.may_begin
    assert len(home.lots) == 5


def test_home_of_a_countersigner_begins_nothing(demo) -> None:
    home = demo.read(open_bench_home, who="ottilie")
    assert (home.mine, home.lots, home.may_begin) == ((), (), False)


def test_home_for_a_visitor_asks_to_sign_in(demo) -> None:
    with pytest.raises(NotSignedIn):
        demo.read(open_bench_home, who=None)


def test_begin_proposes_what_is_in_date_first_and_says_why_not(demo) -> None:
    page = demo.read(open_begin, lot_code(demo, "NaOH"), who="bashir", recipe_id=None)
    assert [one.name for one in page.burettes] == ["Piston burette P-25", "Piston burette P-20"]
    assert page.burettes[0].refused is None
    assert "it has lapsed" in page.burettes[1].refused
    assert [one.name for one in page.standard_lots] == ["KHP, lot PH-2291"]
    assert [one.substance for one in page.cautions] == [
        "sodium hydroxide",
        "potassium hydrogen phthalate",
    ]
    assert page.deferral.startswith("General caution.")
    assert not page.may_override


def test_begin_asks_for_the_rows_of_the_recipe(demo) -> None:
    page = demo.read(open_begin, lot_code(demo, "HCl"), who="jonas", recipe_id=None)
    assert {"Load before taring", "Standard, tared", "Burette, end"} <= set(page.asked)
    assert "Remark" not in page.asked
    assert page.may_override


def test_begin_with_the_code_of_a_bottle_finds_its_lot(demo) -> None:
    bottle = demo.summary.bottles[0]
    page = demo.read(open_begin, f" {bottle.lower()} ", who="bashir", recipe_id=None)
    assert page.lot_code == lot_code(demo, "HCl")


def test_begin_with_a_slip_in_the_code_names_the_nearest(demo) -> None:
    right = demo.summary.bottles[0]
    wrong = right[:-1] + ("2" if right[-1] != "2" else "3")
    with pytest.raises(NotFound) as refused:
        demo.read(open_begin, wrong, who="bashir", recipe_id=None)
    assert refused.value.shown["nearest"] == [right]


def test_begin_for_a_countersigner_is_refused(demo) -> None:
    with pytest.raises(NotAllowed, match="analyst"):
        demo.read(open_begin, lot_code(demo, "NaOH"), who="ottilie", recipe_id=None)


def test_begin_without_a_fitting_recipe_says_who_writes_one(own_demo) -> None:
    actor = own_demo.people["imke"]
    command = MakeUpLot("KMnO4", "0.02")
    code = own_demo.write(lambda s: make_up_lot(s, command, actor=actor, now=own_demo.now))
    with pytest.raises(NotAllowed, match=r"No recipe fits KMnO4 0\.02 mol/L in water; a keeper"):
        own_demo.read(open_begin, code, who="imke", recipe_id=None)
    refused = [one.refused for one in own_demo.read(open_bench_home, who="imke").lots]
    assert sum(one is not None for one in refused) == 1
