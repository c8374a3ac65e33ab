"""A lot from preparation to certificates; holding and pulling it."""

import pytest

from server.lab.refusal import NotAllowed, NotFound, NotSignedIn
from server.procedures.lots import (
    ConfirmPull,
    MakeUpLot,
    ProposePull,
    confirm_pull,
    make_up_lot,
    propose_pull,
)
from server.sheets.bottle_card import open_bottle_card
from server.sheets.certificate_page import open_certificate
from server.sheets.lot_page import open_lot, open_make_up


def act(demo, procedure, command, who):
    actor = demo.people[who]
    return demo.write(lambda s: procedure(s, command, actor=actor, now=demo.now))


def test_lot_shows_preparation_bottles_sheets_and_certificates(demo) -> None:
    page = demo.read(open_lot, demo.summary.bottles_in_force[1], who="bashir")
    facts = {fact.label: fact.value for fact in page.facts}
    assert facts["Made from"] == "50 % caustic, clear supernatant"
    assert facts["Preparation"] == "water boiled out and cooled; mixed 5 minutes"
    assert [bottle.state for bottle in page.bottles] == ["used up", "held", "in force"]
    assert [bool(bottle.reported) for bottle in page.bottles] == [False, False, True]
    assert [sheet.number for sheet in page.sheets] == ["S-2026-0005", "S-2026-0004"]
    assert page.sheets[0].says == f"TL-2026-0005: {page.certificates[0].reported}"
    assert [line.state for line in page.certificates] == ["standing", "replaced"]
    assert page.certificates[0].reported.split()[0] in page.history_chart


@pytest.mark.parametrize(
    ("who", "rights"),
    [
        ("bashir", (True, True, True, False)),
        ("ottilie", (False, True, False, False)),
        ("jonas", (False, True, False, True)),
        ("marisol", (False, False, False, False)),
    ],
)
def test_lot_offers_only_what_the_roles_allow(demo, who, rights) -> None:
    page = demo.read(open_lot, demo.summary.bottles_in_force[1], who=who)
    offered = (page.may_bottle, page.may_hold, page.may_standardize, page.may_propose_pull)
    assert offered == rights
    assert not page.may_confirm_pull


def test_lot_pull_is_proposed_and_confirmed_by_two_people(own_demo) -> None:
    bottle = own_demo.summary.bottles_in_force[1]
    act(own_demo, propose_pull, ProposePull(bottle, "carbonated"), "jonas")
    seen = {who: own_demo.read(open_lot, bottle, who=who) for who in ("jonas", "ottilie")}
    assert seen["ottilie"].may_confirm_pull
    assert not seen["jonas"].may_confirm_pull
    assert not seen["jonas"].may_propose_pull
    assert seen["jonas"].state == "in force"
    assert "Jonas Halework proposed" in seen["jonas"].pull_says
    act(own_demo, confirm_pull, ConfirmPull(bottle), "ottilie")
    page = own_demo.read(open_lot, bottle, who="jonas")
    assert page.state == "pulled"
    assert page.pull_says.endswith("Ottilie Renn confirmed it on 1 Dec 2026, 14:05.")
    assert (page.may_hold, page.may_bottle, page.may_propose_pull) == (False, False, False)
    number = page.certificates[0].number
    assert own_demo.read(open_certificate, number, who="jonas").state == "pulled"
    card = own_demo.read(open_bottle_card, bottle, who=None, at=None)
    assert (card.state, card.value) == ("pulled", "")


def test_lot_unproven_has_no_number_and_no_picture(own_demo) -> None:
    code = act(own_demo, make_up_lot, MakeUpLot("HCl", "0.1"), "imke")
    page = own_demo.read(open_lot, code, who="imke")
    assert (page.state, page.certificates, page.history_chart) == ("unproven", (), "")
    assert page.bottles == page.sheets == ()


def test_make_up_offers_titrants_with_a_recipe_first_and_a_free_name(own_demo) -> None:
    page = own_demo.read(open_make_up, who="imke")
    assert [key for key, _ in page.titrants][:2] == ["HCl", "NaOH"]
    assert page.proposed_name == "2026-12-01 A"
    command = MakeUpLot("NaOH", "0.1", name=page.proposed_name)
    act(own_demo, make_up_lot, command, "imke")
    assert own_demo.read(open_make_up, who="imke").proposed_name == "2026-12-01 B"


def test_make_up_by_a_keeper_is_refused(demo) -> None:
    with pytest.raises(NotAllowed, match="analyst"):
        demo.read(open_make_up, who="jonas")


def test_lot_unknown_is_not_found_and_visitors_sign_in(demo) -> None:
    with pytest.raises(NotFound):
        demo.read(open_lot, "00000000", who="bashir")
    with pytest.raises(NotSignedIn):
        demo.read(open_lot, demo.summary.bottles[0], who=None)
