"""Sessions: begun, idle, ended; failures slowed down."""

from datetime import timedelta
from typing import Any

import pytest

from server.web.pages.session import safe_next


def _token(page: str) -> str:
    return page.partition('name="form_token" value="')[2].partition('"')[0]


def test_sign_in_leads_back_to_the_page_that_asked_for_it(web: Any) -> None:
    visitor = web.visitor()
    page = visitor.get("/trail?person=&thing=S-2026")
    assert page.status_code == 401
    assert 'name="next" value="/trail?person=&amp;thing=S-2026"' in page.text
    form = {
        "form_token": _token(page.text),
        "key": "k",
        "next": "/trail?person=&thing=S-2026",
        "name": "imke",
        "password": web.passwords["imke"],
    }

    answer = visitor.post("/sign-in", data=form)

    assert answer.status_code == 303
    assert answer.headers["location"] == "/trail?person=&thing=S-2026"
    assert visitor.get(answer.headers["location"]).status_code == 200


@pytest.mark.parametrize(
    "given",
    ["https://elsewhere.example/", "//elsewhere.example", "/\\elsewhere", "bench", "", "/\tx"],
)
def test_next_page_of_another_site_is_the_shelf_instead(given: str) -> None:
    assert safe_next(given) == "/"


def test_next_page_of_this_server_is_kept() -> None:
    assert safe_next("/bench/begin?lot=ABC") == "/bench/begin?lot=ABC"


def test_failed_sign_in_keeps_the_name_and_never_the_password(web: Any) -> None:
    visitor = web.visitor()
    token = _token(visitor.get("/sign-in").text)
    form = {"form_token": token, "key": "k", "name": "imke", "password": "not the right words"}

    answer = visitor.post("/sign-in", data=form)

    assert answer.status_code == 401
    assert 'value="imke"' in answer.text
    assert "not the right words" not in answer.text


def test_unknown_name_and_wrong_password_are_answered_with_the_same_words(web: Any) -> None:
    answers = [
        web.visitor().post("/api/session", json={"name": name, "password": "nothing of note"})
        for name in ("imke", "nobody at all")
    ]

    assert [one.status_code for one in answers] == [401, 401]
    assert answers[0].json() == answers[1].json()


def test_failures_in_a_row_are_slowed_down_and_say_how_long(web: Any) -> None:
    """R109: after five failures a wait that doubles; the right password waits as well."""
    visitor = web.visitor()
    wrong = {"name": "imke", "password": "wrong, again and again"}
    right = {"name": "imke", "password": web.passwords["imke"]}
    assert [visitor.post("/api/session", json=wrong).status_code for _ in range(5)] == [401] * 5

    slowed = visitor.post("/api/session", json=right)

    assert slowed.status_code == 429
    assert int(slowed.headers["retry-after"]) >= 1
    web.clock.at += timedelta(seconds=int(slowed.headers["retry-after"]))
    assert visitor.post("/api/session", json=right).status_code == 201


def test_session_that_is_idle_ends(web: Any) -> None:
    imke = web.client("imke")
    web.clock.at += timedelta(minutes=29)
    assert imke.get("/me").status_code == 200
    web.clock.at += timedelta(minutes=29)
    assert imke.get("/me").status_code == 200
    web.clock.at += timedelta(minutes=30)

    assert imke.get("/me").status_code == 401


def test_session_ends_after_twelve_hours_however_busy(web: Any) -> None:
    imke = web.client("imke")
    for _ in range(35):
        web.clock.at += timedelta(minutes=20)
        assert imke.get("/me").status_code == 200
    web.clock.at += timedelta(minutes=20)

    assert imke.get("/me").status_code == 401


def test_sign_in_anew_ends_the_session_that_this_browser_had(web: Any) -> None:
    imke = web.client("imke")
    old = dict(imke.client.cookies)
    given = {"name": "bashir", "password": web.passwords["bashir"]}
    assert imke.client.post("/api/session", json=given).status_code == 201

    stolen = web.visitor()
    stolen.cookies.update(old)

    assert stolen.get("/me").status_code == 401


def test_closed_account_is_signed_out_at_once(web: Any) -> None:
    rosa, steward = web.client("rosa"), web.client("marisol")
    people = steward.get("/api/people").json()["people"]
    person = next(one for one in people if one["sign_in_name"] == "rosa")

    assert steward.post(f"/api/people/{person['id']}/close").status_code == 200

    assert rosa.get("/me").status_code == 401


def test_password_changed_on_ones_page_ends_the_other_sessions(web: Any) -> None:
    here, elsewhere = web.client("imke"), web.client("imke")

    refused = here.form("/me", old="not mine", new="four new words stand here")
    assert refused.status_code == 401
    assert "aria-invalid" in refused.text
    short = here.form("/me", old=web.passwords["imke"], new="short")
    assert short.status_code == 422
    changed = here.form("/me", old=web.passwords["imke"], new="four new words stand here")

    assert changed.status_code == 303
    assert here.get("/me").status_code == 200
    assert elsewhere.get("/me").status_code == 401
    web.passwords["imke"] = "four new words stand here"
    web.client("imke")


def test_password_stands_in_no_answer_and_no_row(web: Any) -> None:
    password = "a password that nobody keeps"
    steward = web.client("marisol")
    answer = steward.form(
        "/people/new", sign_in_name="nils", printed_name="", roles=["reader"], password=password
    )
    assert answer.status_code == 422
    assert password not in answer.text
    body = {"sign_in_name": "nils", "printed_name": "Nils A", "roles": ["reader"]}
    assert steward.post("/api/people", {**body, "password": password}).status_code == 201

    with web.transactions.database.reader.connect() as connection:
        script = "\n".join(connection.connection.iterdump())  # type: ignore[attr-defined]

    assert password not in script
    assert "$argon2id$" in script
