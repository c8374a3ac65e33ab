from concurrent.futures import ThreadPoolExecutor
from random import Random

import pytest
from sqlalchemy import select

from server.lab.codes import holds
from server.lab.refusal import NotAllowed, NotFound, Unacceptable
from server.procedures.lots import (
    ConfirmPull,
    FillBottles,
    MakeUpLot,
    ProposePull,
    UseUpBottle,
    confirm_pull,
    fill_bottles,
    make_up_lot,
    propose_pull,
    use_up_bottle,
)
from server.records.queries.load_lots import bottle_by_code, lot_by_code, lot_is_pulled
from server.records.tables.lots import Bottle


def lot(lab, code):
    return lab.transactions.read(lambda session: lot_by_code(session, code))


def bottle(lab, code):
    return lab.transactions.read(lambda session: bottle_by_code(session, code))


def make_up(lab, who="analyst", **given):
    command = MakeUpLot(**{"titrant": "NaOH", "nominal": "0.1"} | given)
    return lab.act(make_up_lot, command, who)


def test_lot_made_up_is_kept_as_typed_with_a_code_of_its_own(lab):
    code = make_up(
        lab, nominal="0.100", made_from="50 % caustic ", preparation="water boiled\n\n mixed \n",
        name="<b>Lye</b>", use_by="2026-07-31",
    )  # fmt: skip
    found = lot(lab, code)
    assert holds(code)
    assert (found.name, found.nominal, found.medium) == ("<b>Lye</b>", "0.100", "water")
    assert found.document == {
        "prepared_on": "2026-05-04", "made_from": "50 % caustic",
        "preparation": ["water boiled", "mixed"], "use_by": "2026-07-31",
    }  # fmt: skip
    assert lab.acts()[-1] == ("Ida Mohnke", "made up a lot", "lot")


def test_lot_without_a_name_gets_one_that_is_not_taken(sqlite_lab):
    names = [lot(sqlite_lab, make_up(sqlite_lab)).name for _ in range(3)]
    start = "NaOH 0.1 mol/L, 2026-05-04"
    assert names == [f"{start} (2)", f"{start} (3)", f"{start} (4)"]


def test_lots_made_up_at_once_get_different_names(lab):
    with ThreadPoolExecutor(12) as pool:
        codes = list(pool.map(lambda _: make_up(lab), range(12)))
    assert len({lot(lab, code).name for code in codes}) == 12


def test_lot_day_is_the_laboratorys_not_that_of_greenwich(sqlite_lab):
    sqlite_lab.clock.at = sqlite_lab.clock.at.replace(hour=22, minute=30)
    assert lot(sqlite_lab, make_up(sqlite_lab)).document["prepared_on"] == "2026-05-05"


@pytest.mark.parametrize(
    ("given", "field"),
    [
        ({"titrant": ""}, "titrant"),
        ({"nominal": "0,1"}, "nominal"),
        ({"nominal": "0"}, "nominal"),
        ({"nominal": "-0.1"}, "nominal"),
        ({"prepared_on": "2026-05-05"}, "prepared_on"),
        ({"prepared_on": "yesterday"}, "prepared_on"),
        ({"use_by": "2026-05-03"}, "use_by"),
        ({"medium": " "}, "medium"),
        ({"name": "a\nb"}, "name"),
        ({"made_from": "a\0b"}, "made_from"),
        ({"preparation": "x" * 10_001}, "preparation"),
        ({"name": "NaOH 0.1 mol/L, 2026-05-04"}, "name"),
    ],
)
def test_lot_odd_statement_is_refused_by_field(shared_lab, given, field):
    with pytest.raises(Unacceptable) as refused:
        make_up(shared_lab, **given)
    assert refused.value.field == field


# bottles


def test_bottles_are_numbered_on_and_each_has_its_code(lab):
    codes = lab.act(fill_bottles, FillBottles(lab.lot, "Shelf 2", "1000", 3), "analyst")
    found = [bottle(lab, code) for code in codes]
    assert [one.number for one in found] == [2, 3, 4]
    assert len(set(codes)) == 3
    assert all(map(holds, codes))
    assert [act for _, act, _ in lab.acts()[-3:]] == ["filled a bottle"] * 3


def test_bottles_filled_at_once_get_numbers_without_gaps(lab):
    command = FillBottles(lab.lot, "Shelf 2", "500", 2)
    with ThreadPoolExecutor(8) as pool:
        list(pool.map(lambda _: lab.act(fill_bottles, command, "analyst"), range(8)))
    numbers = lab.transactions.read(lambda session: session.scalars(select(Bottle.number)).all())
    assert sorted(numbers) == list(range(1, 18))


def test_code_that_is_taken_is_drawn_again(sqlite_lab):
    first = make_up_with_seed(sqlite_lab, 7)
    assert make_up_with_seed(sqlite_lab, 7) != first


def make_up_with_seed(lab, seed):
    return lab.act(make_up_lot, MakeUpLot("NaOH", "0.1"), "analyst", source=Random(seed))


@pytest.mark.parametrize(
    ("given", "field"),
    [
        ({"count": 0}, "count"),
        ({"count": 51}, "count"),
        ({"volume_mL": "1 L"}, "volume_mL"),
        ({"volume_mL": "0"}, "volume_mL"),
        ({"place": ""}, "place"),
    ],
)
def test_bottles_odd_statement_is_refused_by_field(shared_lab, given, field):
    usual = {"lot_code": shared_lab.lot, "place": "Shelf", "volume_mL": "1000"}
    with pytest.raises(Unacceptable) as refused:
        shared_lab.act(fill_bottles, FillBottles(**usual | given), "analyst")
    assert refused.value.field == field


def test_bottle_used_up_twice_is_noted_once(lab):
    with ThreadPoolExecutor(6) as pool:
        command = UseUpBottle(lab.bottle.lower())
        list(pool.map(lambda _: lab.act(use_up_bottle, command, "analyst"), range(6)))
    assert bottle(lab, lab.bottle).used_up_at == lab.clock()
    assert [act for _, act, _ in lab.acts()].count("used up a bottle") == 1


def test_bottle_unknown_is_not_found(shared_lab):
    with pytest.raises(NotFound) as refused:
        shared_lab.act(use_up_bottle, UseUpBottle("00000000"), "analyst")
    assert refused.value.field == "code"


# pulling needs two people


def test_lot_is_pulled_by_a_keeper_and_a_countersigner(lab):
    lab.act(propose_pull, ProposePull(lab.lot, "wrong salt"), "keeper")
    found = lot(lab, lab.lot)
    assert not lab.transactions.read(lambda session: lot_is_pulled(session, found.id))
    lab.act(confirm_pull, ConfirmPull(lab.lot), "countersigner")
    assert lab.transactions.read(lambda session: lot_is_pulled(session, found.id))
    assert [act for _, act, _ in lab.acts()[-2:]] == ["proposed a pull", "pulled a lot"]
    for again in (
        lambda: lab.act(propose_pull, ProposePull(lab.lot, "again"), "keeper"),
        lambda: lab.act(fill_bottles, FillBottles(lab.lot, "Shelf", "1000"), "analyst"),
    ):
        with pytest.raises(NotAllowed, match="out of use for good"):
            again()


def test_pull_confirmed_by_who_proposed_it_is_refused(sqlite_lab):
    sqlite_lab.act(propose_pull, ProposePull(sqlite_lab.lot, "wrong salt"), "all hands")
    with pytest.raises(NotAllowed, match="You proposed the pull; somebody else confirms"):
        sqlite_lab.act(confirm_pull, ConfirmPull(sqlite_lab.lot), "all hands")


def test_pull_proposed_twice_or_never_is_refused(sqlite_lab):
    with pytest.raises(NotFound, match="No pull of this lot is proposed"):
        sqlite_lab.act(confirm_pull, ConfirmPull(sqlite_lab.lot), "countersigner")
    sqlite_lab.act(propose_pull, ProposePull(sqlite_lab.lot, "wrong salt"), "keeper")
    with pytest.raises(NotAllowed, match="is proposed already"):
        sqlite_lab.act(propose_pull, ProposePull(sqlite_lab.lot, "again"), "second keeper")


def test_pull_without_reason_is_refused(shared_lab):
    with pytest.raises(Unacceptable) as refused:
        shared_lab.act(propose_pull, ProposePull(shared_lab.lot, " "), "keeper")
    assert refused.value.field == "reason"
