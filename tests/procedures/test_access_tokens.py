"""Tokens for scripts, on both engines."""

from datetime import timedelta

import pytest
import sqlalchemy as sa
from sqlalchemy.exc import DBAPIError

from server.credentials.tokens import token_digest
from server.lab.refusal import NotAllowed, NotFound, Unacceptable
from server.lab.scopes import Scope
from server.procedures.access_tokens import (
    MakeToken,
    RevokeToken,
    draw_token,
    find_token,
    make_token,
    record_token_seen,
    revoke_token,
)
from server.procedures.people import CloseAccount, close_account
from server.sheets.own_page import open_own_page


def make(lab, who="analyst", scopes=("look up",), days=90, name="titrator PC"):
    token = draw_token()
    made = lab.act(
        make_token, MakeToken(name, scopes, days), who,
        digest=token_digest(token), proof=lab.proof(who),
    )  # fmt: skip
    return token, made["id"]


def find(lab, token):
    return lab.transactions.read(lambda session: find_token(session, token, now=lab.clock()))


def own_page(lab, who="analyst"):
    return lab.transactions.read(
        lambda session: open_own_page(session, actor=lab.people[who], now=lab.clock())
    )


def test_token_opens_for_its_person_what_was_ticked(lab):
    token, token_id = make(lab, scopes=("export", "look up"))
    assert token.startswith("tl_")
    view = find(lab, token)
    assert (view.token_id, view.actor.printed_name) == (token_id, "Ida Mohnke")
    assert view.scopes == {Scope.LOOK_UP, Scope.EXPORT}
    assert lab.acts()[-1] == ("Ida Mohnke", "made a token", "token")


def test_token_itself_is_kept_nowhere(lab):
    token, _ = make(lab)
    secret = token.removeprefix("tl_")

    def everything(session):
        tables = sa.inspect(session.connection()).get_table_names()
        return [
            str(tuple(row))
            for table in tables
            for row in session.execute(sa.text(f'SELECT * FROM "{table}"'))
        ]

    rows = lab.transactions.read(everything)
    assert len(rows) > 20
    assert not any(secret in row for row in rows)
    assert any(token_digest(token) in row for row in rows)


def test_token_ends_on_its_day_to_the_second(lab):
    token, _ = make(lab, days=1)
    end = lab.clock() + timedelta(days=1)
    lab.clock.at = end - timedelta(microseconds=1)
    assert find(lab, token) is not None
    lab.clock.at = end
    assert find(lab, token) is None
    assert own_page(lab).tokens[0].says == "past its last day"


def test_token_revoked_ends_at_once_and_for_good(lab):
    token, token_id = make(lab)
    lab.act(revoke_token, RevokeToken(token_id), "analyst")
    assert find(lab, token) is None
    lab.clock.move(hours=1)
    lab.act(revoke_token, RevokeToken(token_id), "analyst")
    assert [act for _, act, _ in lab.acts()].count("revoked a token") == 1
    (line,) = own_page(lab).tokens
    assert not line.holds
    assert line.says == "revoked 4 May 2026, 10:30"


def test_token_of_a_closed_account_ends_with_it(sqlite_lab):
    token, _ = make(sqlite_lab)
    person = sqlite_lab.people["analyst"].person_id
    sqlite_lab.act(close_account, CloseAccount(person, "left"), "steward")
    assert find(sqlite_lab, token) is None


def test_token_of_somebody_else_is_not_ones_own(sqlite_lab):
    _, token_id = make(sqlite_lab)
    for who in ("second analyst", "steward"):
        with pytest.raises(NotFound, match="no such token"):
            sqlite_lab.act(revoke_token, RevokeToken(token_id), who)
        assert own_page(sqlite_lab, who).tokens == ()


def test_proof_of_somebody_else_makes_no_token(sqlite_lab):
    with pytest.raises(NotAllowed, match="own password"):
        sqlite_lab.act(
            make_token, MakeToken("x", ("look up",)), "analyst",
            digest="d", proof=sqlite_lab.proof("keeper"),
        )  # fmt: skip


def test_token_beyond_ones_own_roles_is_refused(sqlite_lab):
    with pytest.raises(Unacceptable, match="your own roles"):
        make(sqlite_lab, who="reader", scopes=("record uses",))
    offered = [value for value, _ in own_page(sqlite_lab, "reader").scopes]
    assert offered == ["look up", "export"]


@pytest.mark.parametrize(
    "change",
    [
        'scopes = \'["export","look up","record uses"]\'',
        "expires_at = expires_at + 1",
        "digest = 'other'",
        "person_id = (SELECT id FROM person WHERE sign_in_name = 'steward')",
    ],
)
def test_token_in_the_database_is_never_widened(lab, change):
    make(lab)
    with pytest.raises(DBAPIError, match="never changed"):
        lab.transactions.write(
            lambda session: session.execute(sa.text(f"UPDATE access_token SET {change}"))
        )


@pytest.mark.parametrize("change", ["revoked_at = NULL", "revoked_at = revoked_at + 1"])
def test_revoked_token_stays_revoked_in_the_database(lab, change):
    _, token_id = make(lab)
    lab.act(revoke_token, RevokeToken(token_id), "analyst")
    with pytest.raises(DBAPIError, match="never changed"):
        lab.transactions.write(
            lambda session: session.execute(sa.text(f"UPDATE access_token SET {change}"))
        )


def test_last_use_of_a_token_is_noted_now_and_then(sqlite_lab):
    token, token_id = make(sqlite_lab)
    assert find(sqlite_lab, token).to_touch
    sqlite_lab.transactions.write(
        lambda session: record_token_seen(session, token_id, now=sqlite_lab.clock())
    )
    assert not find(sqlite_lab, token).to_touch
    assert own_page(sqlite_lab).tokens[0].last_used == "4 May 2026, 10:30"
    sqlite_lab.clock.move(minutes=11)
    assert find(sqlite_lab, token).to_touch
