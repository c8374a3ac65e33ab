"""Small rules around the shelf: opened bottles, scopes, moments, scanned addresses."""

from datetime import UTC, datetime, timedelta

import pytest

from server.lab.actor import Actor
from server.lab.codes import code_in
from server.lab.moments import read_moment
from server.lab.opened import bottle_until, opened_end, read_opened_days
from server.lab.refusal import Unacceptable
from server.lab.scopes import Scope, read_days, read_scopes
from server.lab.validity import ValidUntil

NOW = datetime(2026, 5, 4, 8, 30, tzinfo=UTC)


def actor(*roles):
    return Actor("1", "Ida Mohnke", "IM", frozenset(roles), "Europe/Berlin")


def test_opened_bottle_is_good_to_the_end_of_the_local_day():
    # 4 May 2026, 23:30 in Berlin is 21:30 UTC; 30 days later is 3 June, which ends at 22:00 UTC
    opened = datetime(2026, 5, 4, 21, 30, tzinfo=UTC)
    assert opened_end(opened, 30, "Europe/Berlin") == datetime(2026, 6, 3, 22, tzinfo=UTC)


def test_earlier_of_two_ends_rules_and_says_so():
    certified = ValidUntil(NOW + timedelta(days=9), "interval of the recipe")
    assert bottle_until(certified, None) is certified
    assert bottle_until(certified, NOW + timedelta(days=10)) is certified
    shorter = bottle_until(certified, NOW + timedelta(days=8))
    assert shorter.at == NOW + timedelta(days=8)
    assert "open" in shorter.rule


@pytest.mark.parametrize("text", ["0", "-1", "1.5", "3651", "ten", "１０"])
def test_opened_days_that_are_none_are_refused(text):
    with pytest.raises(Unacceptable) as refused:
        read_opened_days(text)
    assert refused.value.field == "opened_days"


def test_opened_days_may_be_left_out():
    assert read_opened_days("  ") is None
    assert read_opened_days(" 30 ") == 30


def test_scopes_are_kept_in_their_order_and_unknown_ones_refused():
    analyst = actor("analyst")
    assert read_scopes(["export", "look up"], analyst) == (Scope.LOOK_UP, Scope.EXPORT)
    for given in ([], ["  "], ["look up", "sign"], ["everything"]):
        with pytest.raises(Unacceptable) as refused:
            read_scopes(given, analyst)
        assert refused.value.field == "scopes"


@pytest.mark.parametrize("role", ["reader", "steward", "countersigner"])
def test_scope_beyond_ones_own_roles_is_refused(role):
    with pytest.raises(Unacceptable, match="your own roles"):
        read_scopes(["record uses"], actor(role))
    assert read_scopes(["look up"], actor(role)) == (Scope.LOOK_UP,)


@pytest.mark.parametrize("days", [0, -1, 367])
def test_token_without_an_end_is_refused(days):
    with pytest.raises(Unacceptable, match="366"):
        read_days(days)


def test_moment_is_local_or_with_its_offset():
    local = read_moment("2026-05-04T10:00", "used_at", zone="Europe/Berlin", now=NOW)
    offset = read_moment("2026-05-04T03:00-05:00", "used_at", zone="Europe/Berlin", now=NOW)
    assert local == offset == datetime(2026, 5, 4, 8, tzinfo=UTC)


def test_moment_a_little_ahead_is_now_and_far_ahead_refused():
    assert read_moment("2026-05-04T08:33Z", "used_at", zone="UTC", now=NOW) == NOW
    for text in ("2026-05-04T08:36Z", "tomorrow", "", "1899-12-31T00:00", "9999-12-31T23:59-12:00"):
        with pytest.raises(Unacceptable) as refused:
            read_moment(text, "used_at", zone="UTC", now=NOW)
        assert refused.value.field == "used_at"


@pytest.mark.parametrize(
    ("text", "code"),
    [
        ("https://ledger.example/b/974CR7Q4", "974CR7Q4"),
        (" https://ledger.example/B/974cr7q4/?at=24.0 ", "974CR7Q4"),
        ("/b/974CR7Q5", ""),
        ("974CR7Q4", ""),
        ("naoh 0.1", ""),
    ],
)
def test_scanned_address_gives_its_code(text, code):
    assert code_in(text) == code
