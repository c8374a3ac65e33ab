"""The card of a bottle: a number only in force, no names for visitors, who may hold."""

from dataclasses import asdict
from datetime import timedelta

import pytest
import sqlalchemy as sa

from server.demo.cast import MEMBERS
from server.lab.refusal import NotFound, NotSignedIn, Unacceptable
from server.procedures.holds import HoldThing, hold_thing
from server.records.tables.lots import Bottle
from server.sheets.bottle_card import open_bottle_card
from server.sheets.look_up import look_up
from server.sheets.lot_page import open_lot
from server.sheets.shelf_page import open_shelf

NO_NUMBER = ("value", "uncertainty", "k", "factor", "good_until", "certificate_number")


def card(demo, code, *, who=None, at=None):
    return demo.read(open_bottle_card, code, who=who, at=at)


def code_of(demo, state):
    return demo.read(open_shelf, who="bashir", words="", state=state).bottles[0].code


def test_card_in_force_shows_the_certified_number(demo) -> None:
    page = card(demo, demo.summary.bottles_in_force[1].lower())
    assert page.in_force
    assert page.titrant == "Sodium hydroxide"
    line = next(
        one
        for one in demo.read(open_shelf, who=None, words="", state="").bottles
        if one.code == page.code
    )
    assert f"{page.value} ± {page.uncertainty} {page.unit} (k = {page.k})" == line.reported
    assert (page.good_until, page.due_in) == ("11 Dec 2026", "in 10 days")
    assert page.checked == "1 Dec 2026, 14:05 (Europe/Zurich)"


@pytest.mark.parametrize("state", ["lapsed", "used up", "held", "unproven"])
@pytest.mark.parametrize("who", [None, "bashir"])
def test_card_out_of_force_shows_why_and_no_number(demo, state, who) -> None:
    page = card(demo, code_of(demo, state), who=who)
    assert (page.state, page.in_force) == (state, False)
    assert page.why
    assert [getattr(page, name) for name in NO_NUMBER] == [""] * len(NO_NUMBER)
    assert (page.at, page.history, page.history_chart) == (None, (), "")


@pytest.mark.parametrize(
    "state", ["in force", "check due", "lapsed", "used up", "held", "unproven"]
)
def test_card_for_a_visitor_names_nobody(demo, state) -> None:
    page = card(demo, code_of(demo, state))
    for member in MEMBERS:
        assert member.printed_name not in repr(asdict(page))
    assert (page.may_hold, page.may_release, page.may_use_up) == (False, False, False)
    assert page.held_says == ""


def test_card_shows_a_visitor_the_standing_number_only(demo) -> None:
    code = demo.summary.bottles_in_force[1]
    assert [one.state for one in card(demo, code).history] == ["standing"]
    inside = card(demo, code, who="bashir")
    assert [one.state for one in inside.history] == ["standing", "replaced"]
    replaced = inside.history[1].reported.split()[0]
    assert replaced not in repr(asdict(card(demo, code)))
    assert replaced in inside.history_chart


def test_card_held_tells_people_who_holds_and_lets_another_release(demo) -> None:
    code = code_of(demo, "held")
    holder, keeper = card(demo, code, who="bashir"), card(demo, code, who="jonas")
    assert holder.held_says == (
        "Bashir Oduya holds this bottle since 29 Nov 2026, 14:05: stood open over the weekend."
    )
    assert (holder.may_hold, holder.may_release) == (False, False)
    assert (keeper.may_hold, keeper.may_release) == (False, True)


def test_card_of_a_bottle_whose_lot_is_held_is_held(own_demo) -> None:
    code = own_demo.summary.bottles_in_force[1]
    lot = card(own_demo, code, who="bashir").lot_code
    actor = own_demo.people["jonas"]
    command = HoldThing("lot", lot, "smells odd")
    own_demo.write(lambda s: hold_thing(s, command, actor=actor, now=own_demo.now))
    page = card(own_demo, code, who="bashir")
    assert (page.state, page.in_force, page.value) == ("held", False, "")
    assert "holds this lot" in page.held_says
    assert page.may_hold


def test_card_lapses_at_the_end_of_the_last_local_day(demo) -> None:
    code = demo.summary.bottles_in_force[1]
    # 11 December in Zurich ends at 23:00 UTC
    end = demo.now.replace(day=11, hour=23, minute=0)
    assert card(demo.at(end - timedelta(microseconds=1)), code).state == "check due"
    assert card(demo.at(end), code).state == "lapsed"


def test_card_at_a_warmer_temperature_is_thinner_and_less_sure(demo) -> None:
    code = demo.summary.bottles_in_force[1]
    at_20, warm = card(demo, code).at, card(demo, code, at="30,0").at
    assert (at_20.celsius, at_20.cooler, at_20.warmer) == ("20.0", "19.0", "21.0")
    assert (warm.celsius, warm.cooler, warm.warmer) == ("30.0", "29.0", "31.0")
    assert float(warm.value) < float(at_20.value)
    assert float(warm.uncertainty) >= float(at_20.uncertainty)
    assert "± 0.5 °C" in warm.says


@pytest.mark.parametrize(("at", "cooler", "warmer"), [("0", "0.0", "1.0"), ("40", "39.0", "40.0")])
def test_card_stepper_stops_at_the_ends(demo, at, cooler, warmer) -> None:
    found = card(demo, demo.summary.bottles_in_force[1], at=at).at
    assert (found.cooler, found.warmer) == (cooler, warmer)


@pytest.mark.parametrize("at", ["warm", "40.1", "-1", "2e1", "١٢"])
def test_card_at_what_is_no_temperature_is_refused_in_words(demo, at) -> None:
    with pytest.raises(Unacceptable) as refused:
        card(demo, demo.summary.bottles_in_force[1], at=at)
    assert (refused.value.field, refused.value.example) == ("at", "24.0")


@pytest.mark.parametrize("typed", ["nothing", "", "ZZZZZZZZ", "<b>", "%" * 8, "x" * 5000])
def test_card_of_an_unknown_code_is_not_found(demo, typed) -> None:
    with pytest.raises(NotFound) as refused:
        card(demo, typed)
    assert refused.value.shown["nearest"] == []


def test_card_on_a_closed_shelf_asks_visitors_to_sign_in(own_demo) -> None:
    import sqlalchemy as sa

    from server.records.tables.people import Laboratory

    def close(session):
        row = session.scalar(sa.select(Laboratory))
        row.settings = {**row.settings, "shelf_open": False}

    own_demo.write(close)
    code = own_demo.summary.bottles_in_force[1]
    with pytest.raises(NotSignedIn):
        card(own_demo, code)
    assert card(own_demo, code, who="bashir").in_force


def test_opened_bottle_lapses_before_its_lot_and_says_which_rule_sets_the_day(own_demo) -> None:
    code = own_demo.summary.bottles_in_force[1]  # its certificate is good until 11 December

    def opened(session):
        bottle = session.scalar(sa.select(Bottle).where(Bottle.code == code))
        bottle.opened_at = own_demo.now - timedelta(days=1)
        bottle.opened_until = own_demo.now + timedelta(days=2)

    own_demo.write(opened)
    page = card(own_demo, code)
    assert page.in_force
    assert page.good_until == "3 Dec 2026"
    assert "open" in page.good_until_rule
    assert page.opened.startswith("30 Nov 2026, 14:05; open it keeps until 3 Dec 2026")

    later = own_demo.at(own_demo.now + timedelta(days=2))
    page = card(later, code)
    assert (page.state, page.in_force, page.value) == ("lapsed", False, "")
    assert "Take another bottle" in page.why
    lot = later.read(open_lot, code, who="bashir")
    assert lot.state == "in force"  # another bottle of it may be used
    found = later.transactions.read(lambda session: look_up(session, code, at=None, now=later.now))
    assert (found["state"], found["in_force"], found["valid_until"]) == ("lapsed", False, None)
