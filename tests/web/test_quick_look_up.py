"""The quick way of the look-up tells what the ordinary one tells, and nothing that has ended."""

import json
import sqlite3
from datetime import datetime, timedelta
from typing import Any

import pytest

#: A cookie of no session sends a request the ordinary way.
ORDINARY = {"Cookie": "nothing=1"}


def _without_instant(answer: Any) -> dict[str, Any]:
    told: dict[str, Any] = answer.json()
    return told | {"as_of": None}


def test_quick_and_ordinary_way_tell_the_same_of_every_bottle(shared_web: Any) -> None:
    visitor = shared_web.visitor()
    states = set()
    for code in shared_web.demo.bottles:
        for _ in range(2):  # the second time from memory
            quick = visitor.get(f"/api/bottles/{code.lower()}")
            ordinary = visitor.get(f"/api/bottles/{code}", headers=ORDINARY)
            assert quick.status_code == ordinary.status_code == 200
            assert _without_instant(quick) == _without_instant(ordinary)
            assert dict(quick.headers) == dict(ordinary.headers)
        states.add(quick.json()["state"])
        text = {"Accept": "text/plain"}
        assert (
            visitor.get(f"/api/bottles/{code}", headers=text).text
            == visitor.get(f"/api/bottles/{code}", headers=text | ORDINARY).text
        )
    assert len(states) > 2


def test_unknown_code_is_answered_and_counted_as_ever(shared_web: Any) -> None:
    visitor = shared_web.visitor()
    quick, ordinary = (
        visitor.get("/api/bottles/ZZZZZZZZ", headers=headers) for headers in ({}, ORDINARY)
    )
    assert quick.status_code == ordinary.status_code == 404
    assert quick.json() == ordinary.json()


@pytest.fixture
def asked(web: Any) -> Any:
    """Asking for one bottle in force, which was asked for before."""
    visitor, code = web.visitor(), web.demo.bottles_in_force[0]

    def ask() -> dict[str, Any]:
        told: dict[str, Any] = visitor.get(f"/api/bottles/{code}").json()
        return told

    assert ask()["in_force"]
    assert ask()["in_force"]
    return ask


def test_hold_shows_at_the_very_next_look_up(web: Any, asked: Any) -> None:
    keeper, code = web.client("jonas"), web.demo.bottles_in_force[0]
    held = {"kind": "bottle", "thing": code, "reason": "cloudy"}
    assert keeper.post("/api/holds", held).status_code in {200, 201}
    found = asked()
    assert (found["state"], found["concentration"]) == ("held", None)


def test_instant_at_which_it_ends_is_told_to_the_second(web: Any, asked: Any) -> None:
    ends = datetime.fromisoformat(asked()["valid_until"])
    web.clock.at = ends - timedelta(microseconds=1)
    assert asked()["in_force"]
    web.clock.at = ends
    assert (asked()["state"], asked()["concentration"]) == ("lapsed", None)


def test_number_changed_by_another_program_is_noticed_at_once(web: Any, asked: Any) -> None:
    number = asked()["certificate"]["number"]
    path = web.transactions.database.url.database
    other = sqlite3.connect(path)
    for (name,) in other.execute(
        "SELECT name FROM sqlite_master WHERE type = 'trigger'"
    ).fetchall():
        other.execute(f'DROP TRIGGER "{name}"')
    other.execute("UPDATE certificate SET document = document || ' ' WHERE number = ?", (number,))
    other.commit()
    other.close()
    assert asked()["in_force"] is False


def test_closed_shelf_refuses_a_visitor_at_the_next_look_up(web: Any, asked: Any) -> None:
    path = web.transactions.database.url.database
    other = sqlite3.connect(path)
    (settings,) = other.execute("SELECT settings FROM laboratory").fetchone()
    closed = json.dumps(json.loads(settings) | {"shelf_open": False})
    other.execute("UPDATE laboratory SET settings = ?", (closed,))
    other.commit()
    other.close()
    assert asked()["status"] == 401
