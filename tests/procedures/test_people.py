from concurrent.futures import ThreadPoolExecutor

import pytest

from server.credentials.passwords import verify_password
from server.lab.refusal import NotAllowed, NotFound, NotSignedIn, SavedFirst, Unacceptable
from server.procedures.people import (
    AddPerson,
    ChangePassword,
    ChangeRoles,
    CloseAccount,
    add_person,
    change_password,
    change_roles,
    close_account,
    hash_new_password,
)
from server.procedures.sign_in import find_account, find_actor, record_sign_in
from server.records.tables.people import Person


def add(lab, **given):
    usual = {
        "sign_in_name": "n.ew",
        "printed_name": "Nia Ewers",
        "roles": ("analyst",),
        "password": "",
    }
    return lab.act(add_person, AddPerson(**usual | given), "steward", password_hash="none")


def person(lab, word):
    key = lab.people[word].person_id if word in lab.people else word
    return lab.transactions.read(lambda session: session.get(Person, key))


def roles(lab, word, wanted, revision=1):
    command = ChangeRoles(lab.people[word].person_id, wanted, revision)
    return lab.act(change_roles, command, "steward")


def signed_in(lab, word):
    def work(session):
        check = find_account(session, person(lab, word).sign_in_name, source="s", now=lab.clock())
        return record_sign_in(session, check, holds=True, source="s", now=lab.clock())

    return lab.transactions.write(work)


def holds(lab, token):
    view = lab.transactions.read(lambda session: find_actor(session, token, now=lab.clock()))
    return view is not None


def test_person_added_is_kept_with_roles_and_initials(lab):
    key = add(
        lab, sign_in_name=" N.Ew ", printed_name="Nia <i>Ewers</i>", roles=("reader", "keeper")
    )
    found = person(lab, key)
    assert (found.sign_in_name, found.printed_name) == ("n.ew", "Nia <i>Ewers</i>")
    assert found.roles == ["keeper", "reader"]
    assert lab.acts()[-1] == ("Runa Askvall", "added a person", "person")


@pytest.mark.parametrize(
    ("given", "field"),
    [
        ({"sign_in_name": "analyst"}, "sign_in_name"),
        ({"sign_in_name": "ANALYST "}, "sign_in_name"),
        ({"sign_in_name": ""}, "sign_in_name"),
        ({"printed_name": " "}, "printed_name"),
        ({"printed_name": "a\nb"}, "printed_name"),
        ({"roles": ()}, "roles"),
        ({"roles": ("steward", "analyst")}, "roles"),
        ({"initials": "TOOLONG"}, "initials"),
        ({"initials": "a\0"}, "initials"),
    ],
)
def test_person_odd_statement_is_refused_by_field(shared_lab, given, field):
    with pytest.raises(Unacceptable) as refused:
        add(shared_lab, **given)
    assert refused.value.field == field


def test_sign_in_name_of_a_closed_account_is_never_given_out_again(sqlite_lab):
    close = CloseAccount(sqlite_lab.people["reader"].person_id, "moved away")
    sqlite_lab.act(close_account, close, "steward")
    with pytest.raises(Unacceptable, match="never reused"):
        add(sqlite_lab, sign_in_name="reader")


def test_account_closed_ends_its_sessions_and_keeps_the_name(lab):
    session = signed_in(lab, "analyst")
    assert holds(lab, session.token)
    lab.act(close_account, CloseAccount(lab.people["analyst"].person_id, "moved away"), "steward")
    assert not holds(lab, session.token)
    assert not person(lab, "analyst").active
    assert lab.facts().begun_by.printed_name == "Ida Mohnke"
    assert signed_in(lab, "analyst") is None


def test_roles_changed_count_at_once_and_are_noted_with_before_and_after(lab):
    session = signed_in(lab, "analyst")
    assert roles(lab, "analyst", ("reader",)) == 2
    view = lab.transactions.read(
        lambda session_: find_actor(session_, session.token, now=lab.clock())
    )  # fmt: skip
    assert view.actor.roles == {"reader"}
    assert lab.acts()[-1] == ("Runa Askvall", "changed roles", "person")


def test_roles_changed_by_twelve_at_once_are_changed_once(lab):
    def change(n):
        try:
            return roles(lab, "reader", (("analyst",), ("keeper",))[n % 2])
        except SavedFirst as refused:
            return refused.shown["standing"]["roles"]

    with ThreadPoolExecutor(12) as pool:
        answers = list(pool.map(change, range(12)))
    kept = person(lab, "reader")
    assert kept.revision == 2
    assert sorted(map(str, answers)) == sorted(["2", *[str(kept.roles)] * 11])


def test_last_steward_cannot_be_closed_or_lose_the_role(sqlite_lab):
    key = sqlite_lab.people["steward"].person_id
    with pytest.raises(NotAllowed, match="This is the last steward"):
        sqlite_lab.act(close_account, CloseAccount(key), "steward")
    with pytest.raises(NotAllowed, match="This is the last steward"):
        roles(sqlite_lab, "steward", ("analyst",))
    roles(sqlite_lab, "reader", ("steward",))
    roles(sqlite_lab, "steward", ("analyst",))


def test_two_stewards_closing_each_other_at_once_leave_one(lab):
    roles(lab, "reader", ("steward",))
    stewards = ("steward", "reader")

    def close(n):
        command = CloseAccount(lab.people[stewards[1 - n]].person_id)
        try:
            lab.act(close_account, command, "steward")
        except NotAllowed:
            return False
        return True

    with ThreadPoolExecutor(2) as pool:
        done = list(pool.map(close, range(2)))
    assert sum(done) == 1
    assert sum(person(lab, word).active for word in stewards) == 1


def test_person_unknown_is_not_found(shared_lab):
    with pytest.raises(NotFound):
        shared_lab.act(close_account, CloseAccount("x"), "steward")


def test_password_changed_after_proof_ends_the_sessions(lab):
    session = signed_in(lab, "analyst")
    hashed = hash_new_password("meadow lantern 41 heron", names=("Ida Mohnke",))
    assert verify_password(hashed, "meadow lantern 41 heron")
    lab.act(
        change_password, ChangePassword(""), "analyst",
        password_hash=hashed, proof=lab.proof("analyst"),
    )  # fmt: skip
    assert person(lab, "analyst").password_hash == hashed
    assert not holds(lab, session.token)
    assert lab.acts()[-1] == ("Ida Mohnke", "changed the own password", "person")


def test_password_change_with_somebody_elses_proof_is_refused(sqlite_lab):
    with pytest.raises(NotSignedIn):
        sqlite_lab.act(
            change_password, ChangePassword(""), "analyst",
            password_hash="x", proof=sqlite_lab.proof("steward"),
        )  # fmt: skip


def test_password_too_short_is_refused():
    with pytest.raises(Unacceptable):
        hash_new_password("short", names=())
