"""The first day: an empty database, a set-up code, a steward."""

from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import pytest
from fastapi.testclient import TestClient

from server.app import build_app
from server.records.transaction import Transactions
from server.settings import Settings

CODE = "SETUPCODE"
FORM = {
    "setup_code": CODE,
    "laboratory": "Laboratory of the lower weir",
    "address": "1 Weir Lane",
    "zone": "Europe/Zurich",
    "sign_in_name": "una",
    "printed_name": "Una Tarn",
    "password": "five words of her very own",
}


@pytest.fixture
def browser(fresh_sqlite: Callable[[], Any], clock: Any, tmp_path: Path) -> Iterator[TestClient]:
    transactions = Transactions(fresh_sqlite())
    settings = Settings(data=tmp_path, database_url="sqlite://")
    app = build_app(settings, transactions=transactions, clock=clock, setup_code=CODE)
    with TestClient(app, base_url="https://testserver", follow_redirects=False) as client:
        yield client


def _send(browser: TestClient, **more: str) -> Any:
    page = browser.get("/setup").text
    token = page.partition('name="form_token" value="')[2].partition('"')[0]
    return browser.post("/setup", data={"form_token": token, "key": "k", **FORM, **more})


def test_empty_notebook_leads_to_its_set_up(browser: TestClient) -> None:
    assert browser.get("/").headers["location"] == "/setup"
    assert browser.get("/sign-in").headers["location"] == "/setup"
    assert browser.get("/health").json()["set_up"] is False
    assert browser.get("/bench").status_code == 401


def test_steward_sets_up_signs_in_and_adds_people(browser: TestClient) -> None:
    answer = _send(browser)
    assert answer.status_code == 303
    assert answer.headers["location"] == "/sign-in"
    given = {"name": "una", "password": FORM["password"]}

    begun = browser.post("/api/session", json=given)

    assert begun.json()["person"]["roles"] == ["steward"]
    assert browser.get("/people").status_code == 200
    assert "Laboratory of the lower weir" in browser.get("/about").text
    for path in ("/", "/bench", "/stores", "/instruments", "/trail", "/countersign"):
        assert browser.get(path).status_code == 200, path


@pytest.mark.parametrize(
    ("more", "status"),
    [
        ({"setup_code": "GUESSED"}, 403),
        ({"password": "short"}, 422),
        ({"zone": "Mars/Base"}, 422),
        ({"laboratory": " "}, 422),
        ({"printed_name": ""}, 422),
    ],
)
def test_set_up_that_cannot_be_is_refused_and_keeps_what_was_typed(
    browser: TestClient, more: dict[str, str], status: int
) -> None:
    answer = _send(browser, **more)

    assert answer.status_code == status
    assert "1 Weir Lane" in answer.text
    assert FORM["password"] not in answer.text
    assert browser.get("/health").json()["set_up"] is False


def test_second_set_up_is_refused(browser: TestClient) -> None:
    assert _send(browser).status_code == 303
    page = browser.get("/sign-in").text
    token = page.partition('name="form_token" value="')[2].partition('"')[0]

    again = browser.post("/setup", data={"form_token": token, "key": "k", **FORM})

    assert again.status_code == 403
    assert browser.get("/setup").headers["location"] == "/sign-in"
