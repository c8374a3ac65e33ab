from datetime import timedelta

import pytest

from server.lab.refusal import NotSignedIn, TooOften
from server.procedures.people import CloseAccount, close_account
from server.procedures.sign_in import (
    find_account,
    find_actor,
    find_own_account,
    record_proof,
    record_seen,
    record_sign_in,
    sign_out,
)
from server.procedures.throttle import ALERT_AT, FREE_FAILURES
from server.records.tables.people import Person, SignIn, SignInFailure

SOURCE = "192.0.2.7"


def check(lab, name="analyst", source=SOURCE):
    return lab.transactions.read(
        lambda session: find_account(session, name, source=source, now=lab.clock())
    )


def sign_in(lab, name="analyst", *, holds=True, source=SOURCE, **more):
    found = check(lab, name, source)
    return lab.transactions.write(
        lambda session: record_sign_in(
            session, found, holds=holds, source=source, now=lab.clock(), **more
        )
    )


def view(lab, token):
    return lab.transactions.read(lambda session: find_actor(session, token, now=lab.clock()))


def failing(lab, count, **more):
    for _ in range(count):
        assert sign_in(lab, holds=False, **more) is None
        lab.clock.move(seconds=check(lab, more.get("name", "analyst")).wait_s)


def test_sign_in_begins_a_session_of_the_person_and_is_noted(lab):
    signed = sign_in(lab, " ANALYST ")
    found = view(lab, signed.token)
    assert found.actor == lab.people["analyst"]
    assert found.form_token == signed.form_token
    assert lab.acts()[-1] == ("Ida Mohnke", "signed in", "person")


def test_token_is_never_stored_nor_shown(sqlite_lab):
    signed = sign_in(sqlite_lab)
    rows = sqlite_lab.transactions.read(lambda session: session.query(SignIn).all())
    assert signed.token not in {rows[0].token_digest, rows[0].form_token}
    assert signed.token not in repr(signed)


def test_unknown_name_gets_a_hash_like_a_known_one(sqlite_lab):
    found = check(sqlite_lab, "nobody")
    assert found.person_id is None
    assert found.password_hash.startswith("$argon2id$")
    assert found.password_hash not in repr(found)
    assert not found.needs_rehash
    assert sign_in(sqlite_lab, "nobody") is None


def test_closed_account_does_not_sign_in(sqlite_lab):
    close = CloseAccount(sqlite_lab.people["analyst"].person_id)
    sqlite_lab.act(close_account, close, "steward")
    assert check(sqlite_lab).person_id is None
    assert sign_in(sqlite_lab) is None


def test_new_hash_replaces_the_old_one(sqlite_lab):
    sign_in(sqlite_lab, new_hash="newer")
    key = sqlite_lab.people["analyst"].person_id
    assert sqlite_lab.transactions.read(lambda s: s.get(Person, key).password_hash) == "newer"


# sessions end


def test_session_idle_too_long_does_not_hold(lab):
    token = sign_in(lab).token
    lab.clock.move(minutes=29, seconds=59)
    assert view(lab, token).to_touch
    lab.clock.move(seconds=1)
    assert view(lab, token) is None


def test_session_seen_is_not_idle_but_ends_after_twelve_hours(lab):
    token = sign_in(lab).token
    for _ in range(36):
        lab.clock.move(minutes=19, seconds=59)
        assert view(lab, token)
        lab.transactions.write(lambda session: record_seen(session, token, now=lab.clock()))
        assert not view(lab, token).to_touch
    lab.clock.move(minutes=5)
    assert view(lab, token) is None


def test_session_signed_out_does_not_hold_and_is_noted_once(lab):
    token = sign_in(lab).token
    for _ in range(2):
        lab.transactions.write(lambda session: sign_out(session, token, now=lab.clock()))
    assert view(lab, token) is None
    assert [act for _, act, _ in lab.acts()].count("signed out") == 1


@pytest.mark.parametrize("token", ["", "x", "0" * 64])
def test_token_unknown_does_not_hold(shared_lab, token):
    assert view(shared_lab, token) is None


# throttle


def test_failures_beyond_five_wait_longer_each_time(lab):
    waits = []
    for _ in range(FREE_FAILURES + 3):
        assert sign_in(lab, holds=False) is None
        waits.append(check(lab).wait_s)
        lab.clock.move(seconds=waits[-1])
    assert waits == [0, 0, 0, 0, 1, 2, 4, 8]


def test_try_before_the_wait_is_over_is_refused_even_with_the_right_password(lab):
    failing(lab, FREE_FAILURES + 2)
    sign_in(lab, holds=False)
    with pytest.raises(TooOften) as refused:
        sign_in(lab)
    assert refused.value.shown["retry_after_s"] == pytest.approx(8)
    with pytest.raises(TooOften):
        check(lab).refuse_if_early()
    lab.clock.move(seconds=8)
    assert sign_in(lab)
    assert check(lab, source="elsewhere").wait_s == 0


def test_wait_is_never_longer_than_a_quarter_of_an_hour(sqlite_lab):
    failing(sqlite_lab, 20)
    sign_in(sqlite_lab, holds=False)
    assert check(sqlite_lab).wait_s == 15 * 60


def test_failures_of_one_source_over_many_names_wait_too(sqlite_lab):
    for n in range(FREE_FAILURES):
        sign_in(sqlite_lab, f"name {n}", holds=False)
    assert check(sqlite_lab).wait_s == 1
    assert check(sqlite_lab, source="elsewhere").wait_s == 0


def test_failures_are_forgotten_after_half_an_hour(sqlite_lab):
    failing(sqlite_lab, FREE_FAILURES)
    sqlite_lab.clock.move(minutes=31)
    sign_in(sqlite_lab, holds=False)
    assert check(sqlite_lab).wait_s == 0


def test_failures_repeated_are_noted_for_a_known_account_only(lab):
    failing(lab, ALERT_AT)
    noted = [one for one in lab.acts() if one[1] == "failed to sign in repeatedly"]
    assert noted == [("Titrant Ledger", "failed to sign in repeatedly", "person")]
    assert lab.chain().holds


# proofs for signatures


def prove(lab, *, holds, who="analyst"):
    actor = lab.people[who]
    return lab.transactions.write(
        lambda session: record_proof(session, actor, holds=holds, source=SOURCE, now=lab.clock())
    )


def test_proof_of_the_right_password_is_of_this_person_and_instant(lab):
    proof = prove(lab, holds=True)
    assert (proof.person_id, proof.given_at) == (lab.people["analyst"].person_id, lab.clock())


def test_proof_of_a_wrong_password_is_none_and_counts_as_failure(lab):
    for _ in range(FREE_FAILURES):
        assert prove(lab, holds=False) is None
    with pytest.raises(TooOften):
        prove(lab, holds=True)
    rows = lab.transactions.read(lambda session: session.query(SignInFailure).all())
    assert {row.count for row in rows} == {FREE_FAILURES}


def test_own_account_closed_meanwhile_is_refused(sqlite_lab):
    actor = sqlite_lab.people["analyst"]
    sqlite_lab.act(close_account, CloseAccount(actor.person_id), "steward")
    with pytest.raises(NotSignedIn, match="This account is closed"):
        sqlite_lab.transactions.read(
            lambda session: find_own_account(
                session, actor, source=SOURCE, now=sqlite_lab.clock() + timedelta(0)
            )
        )
