from concurrent.futures import ThreadPoolExecutor

import pytest

from server.lab.refusal import NotAllowed, SavedFirst, Unacceptable
from server.procedures.laboratory import (
    ChangeSettings,
    SetUpLaboratory,
    change_settings,
    set_up_laboratory,
)
from server.records.queries.load_sheet import load_laboratory_fact
from server.records.queries.loading import laboratory_row

FIRST = SetUpLaboratory("Small laboratory", "1 Lane", "Europe/Berlin", "m.lind", "Maren Lind", "x")


def set_up(transactions, clock, command=FIRST):
    return transactions.write(
        lambda session: set_up_laboratory(session, command, password_hash="none", now=clock())
    )


def change(lab, **given):
    usual = {"name": "Test laboratory", "address": "", "zone": "Europe/Berlin", "revision": 1}
    return lab.act(change_settings, ChangeSettings(**usual | given), "steward")


def test_laboratory_is_set_up_once_even_by_eight_at_once(transactions, clock):
    def one(_):
        try:
            return set_up(transactions, clock)
        except NotAllowed:
            return None

    with ThreadPoolExecutor(8) as pool:
        stewards = [found for found in pool.map(one, range(8)) if found]
    assert len(stewards) == 1
    fact = transactions.read(load_laboratory_fact)
    assert (fact.name, fact.zone, fact.own_signature) == (
        "Small laboratory",
        "Europe/Berlin",
        False,
    )


@pytest.mark.parametrize(
    ("name", "zone", "sign_in", "printed", "field"),
    [
        ("", "UTC", "m", "M", "name"),
        ("x", "Mars", "m", "M", "zone"),
        ("x", "UTC", " ", "M", "sign_in_name"),
        ("x", "UTC", "m", "\0", "printed_name"),
    ],
)
def test_set_up_with_an_odd_statement_is_refused_by_field(
    sqlite_transactions, clock, name, zone, sign_in, printed, field
):
    command = SetUpLaboratory(name, "", zone, sign_in, printed, "x")
    with pytest.raises(Unacceptable) as refused:
        set_up(sqlite_transactions, clock, command)
    assert refused.value.field == field


def test_settings_changed_are_noted_with_before_and_after(lab):
    assert change(lab, shelf_open=False, limits={"spread_percent": "0.15"}, own_signature=True) == 2
    fact = lab.transactions.read(load_laboratory_fact)
    assert fact.settings["limits"] == {"spread_percent": "0.15"}
    assert fact.settings["absolute_hours"] == 12
    assert (fact.settings["shelf_open"], fact.own_signature) == (False, True)
    assert lab.acts()[-1] == ("Runa Askvall", "changed the settings", "laboratory")


def test_settings_saved_by_twelve_at_once_are_saved_once_and_both_are_shown(lab):
    def save(n):
        try:
            return change(lab, name=f"Laboratory {n}")
        except SavedFirst as refused:
            return refused.shown["standing"]["name"]

    with ThreadPoolExecutor(12) as pool:
        answers = list(pool.map(save, range(12)))
    kept = lab.transactions.read(laboratory_row)
    assert kept.revision == 2
    assert sorted(map(str, answers)) == sorted(["2", *[kept.name] * 11])


@pytest.mark.parametrize(
    ("given", "field"),
    [
        ({"zone": "Mars"}, "zone"),
        ({"limits": {"spread": "1"}}, "limits.spread"),
        ({"limits": {"spread_percent": "much"}}, "limits.spread_percent"),
        ({"idle_minutes": 0}, "idle_minutes"),
        ({"idle_minutes": 721}, "idle_minutes"),
        ({"name": ""}, "name"),
        ({"address": "a\0"}, "address"),
    ],
)
def test_settings_odd_value_is_refused_by_field_and_nothing_changes(shared_lab, given, field):
    with pytest.raises(Unacceptable) as refused:
        change(shared_lab, **given)
    assert refused.value.field == field
    assert shared_lab.transactions.read(laboratory_row).revision == 1


def test_settings_that_are_not_given_stay_as_they_are(lab):
    change(lab, shelf_open=False, own_signature=True, idle_minutes=45)
    change(lab, revision=2)
    row = lab.transactions.read(load_laboratory_fact)
    assert row.own_signature is True
    assert (row.settings["shelf_open"], row.settings["idle_minutes"]) == (False, 45)
