"""Standard lots and recipes as they are read."""

from datetime import timedelta
from uuid import uuid4

import pytest
import sqlalchemy as sa

from server.lab.refusal import NotFound, NotSignedIn
from server.procedures.holds import HoldThing, hold_thing
from server.procedures.laboratory import ChangeSettings, change_settings
from server.procedures.stores import WriteRecipe, write_recipe
from server.records.tables.stores import Recipe, StandardLot
from server.sheets.standard_lot_page import open_standard_lot
from server.sheets.stores_page import open_recipe, open_stores


def khp(demo):
    asked = sa.select(StandardLot.id).where(StandardLot.substance == "KHP")
    return demo.transactions.read(lambda s: s.scalar(asked))


def recipe_row(demo):
    asked = sa.select(Recipe).where(Recipe.titrant == "NaOH").order_by(Recipe.version.desc())

    def load(session):
        row = session.scalars(asked).first()
        return row.id, row.name, row.version, row.document

    return demo.transactions.read(load)


def facts_of(page):
    return {fact.label: fact.value for fact in page.facts}


def test_stores_list_lots_with_what_their_certificates_state(demo) -> None:
    page = demo.read(open_stores, who="jonas")
    assert [(line.name, line.state) for line in page.standard_lots] == [
        ("KHP, lot PH-2291", "in date"),
        ("TRIS, lot TM-0870", "in date"),
    ]
    assert page.standard_lots[0].says == "mass fraction 0.99986, U = 0.00034 (k = 2)"
    assert [line.against for line in page.recipes] == ["TRIS", "KHP", "KHP"]
    assert page.may_keep


def test_stores_for_an_analyst_keep_nothing(demo) -> None:
    assert not demo.read(open_stores, who="bashir").may_keep


def test_stores_standard_lot_changes_state_with_time(demo) -> None:
    due = demo.transactions.read(lambda s: s.get_one(StandardLot, khp(demo)).due_at)
    for now, state in (
        (due - timedelta(days=30), "due soon"),
        (due - timedelta(days=30, seconds=1), "in date"),
        (due, "lapsed"),
    ):
        assert demo.at(now).read(open_standard_lot, khp(demo), who="jonas").state == state


def test_standard_lot_tells_where_it_was_used_and_who_holds_it(own_demo) -> None:
    actor = own_demo.people["bashir"]
    command = HoldThing("standard lot", khp(own_demo), "lid was off")
    own_demo.write(lambda s: hold_thing(s, command, actor=actor, now=own_demo.now))
    page = own_demo.read(open_standard_lot, khp(own_demo), who="jonas")
    assert len(page.sheets) == 7
    assert (page.state, page.may_hold, page.may_release) == ("held", False, True)
    assert page.held_says.endswith("lid was off.")
    asked = "2 h at 120 °C, then in a desiccator (110 to 125 °C, 2 h, cooled in a desiccator)"
    assert facts_of(page)["Drying"] == page.drying_asked == asked
    assert own_demo.read(open_stores, who="jonas").standard_lots[1].state == "held"


def test_recipe_shows_limits_with_their_basis(own_demo) -> None:
    marisol = own_demo.people["marisol"]
    command = ChangeSettings(
        "Tarnbeck", "", "Europe/Zurich", revision=1, limits={"nominal_percent": "5.0"}
    )
    own_demo.write(lambda s: change_settings(s, command, actor=marisol, now=own_demo.now))
    page = own_demo.read(open_recipe, recipe_row(own_demo)[0], who="bashir")
    limits = {name: (limit, basis) for name, limit, basis in page.limits}
    assert limits["Distance from nominal, at most"] == ("5.0 %", "set by the laboratory")
    assert limits["Relative standard deviation, at most"] == (
        "0.2 %",
        "Ph. Eur. 4.2.2: relative standard deviation at most 0.2 %",
    )


def test_recipe_older_version_stays_readable(own_demo) -> None:
    first, name, version, document = recipe_row(own_demo)
    jonas = own_demo.people["jonas"]
    command = WriteRecipe(name, {**document, "interval_days": 10}, version=version)
    second = own_demo.write(lambda s: write_recipe(s, command, actor=jonas, now=own_demo.now))
    old, new = (own_demo.read(open_recipe, one, who="jonas") for one in (first, second))
    assert facts_of(old)["Certificate good for"] == "14 days"
    assert facts_of(new)["Certificate good for"] == "10 days"
    assert (
        new.versions
        == old.versions
        == (
            (2, f"/stores/recipes/{second}"),
            (1, f"/stores/recipes/{first}"),
        )
    )
    lines = own_demo.read(open_stores, who="jonas").recipes
    assert [line.version for line in lines if line.name == name] == [2]


@pytest.mark.parametrize("opened", [open_recipe, open_standard_lot])
def test_stores_unknown_things_are_not_found_and_visitors_sign_in(demo, opened) -> None:
    with pytest.raises(NotFound):
        demo.read(opened, str(uuid4()), who="jonas")
    with pytest.raises(NotSignedIn):
        demo.read(opened, str(uuid4()), who=None)
