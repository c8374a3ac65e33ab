"""Tokens for scripts over HTTP: made and shown once on the own page, and closed to all else."""

import re
from datetime import timedelta
from typing import Any

import pytest

from server.lab.scopes import Scope

ALL = [scope.value for scope in Scope]


def make(hand: Any, **more: Any) -> Any:
    asked = {"name": "titrator PC", "scopes": ALL, "password": hand.password, **more}
    return hand.post("/api/tokens", asked)


def script(web: Any, token: str) -> Any:
    client = web.visitor()
    client.headers["Authorization"] = f"Bearer {token}"
    return client


@pytest.fixture
def imke(web: Any) -> Any:
    return web.client("imke")


@pytest.fixture
def bottle(web: Any) -> str:
    code: str = web.demo.bottles_in_force[0]
    return code


def test_token_made_on_the_own_page_is_shown_there_once(web: Any, imke: Any, bottle: str) -> None:
    form = {"name": "LIMS", "scopes": ["look up"], "days": "30", "password": imke.password}
    page = imke.form("/me/tokens", key="one", **form)
    assert page.status_code == 200
    assert page.headers["cache-control"] == "no-store"
    (token,) = re.findall(r'value="(tl_[\w-]{43})"', page.text)
    assert script(web, token).get(f"/api/bottles/{bottle}").status_code == 200
    again = imke.get("/me").text
    assert "LIMS" in again
    assert token not in again
    repeat = imke.form("/me/tokens", key="one", **form)
    assert repeat.status_code == 409
    assert "tl_" not in repeat.text
    assert len(imke.get("/api/tokens").json()["tokens"]) == 1


def test_token_without_the_right_password_is_not_made(imke: Any) -> None:
    assert make(imke, password="wrong").status_code == 401
    page = imke.form("/me/tokens", name="LIMS", scopes=["look up"], days="30", password="wrong")
    assert page.status_code == 401
    assert 'value="LIMS"' in page.text  # what was typed is still there
    assert imke.get("/api/tokens").json()["tokens"] == []


def test_token_reads_number_and_unit_on_one_line(web: Any, imke: Any, bottle: str) -> None:
    mine = script(web, make(imke).json()["token"])
    line = mine.get(f"/api/bottles/{bottle}", headers={"Accept": "text/plain"}).text
    assert re.fullmatch(r"[0-9.]+ mol/L\n", line)


def test_script_records_a_use_and_reads_how_the_bottle_stood(
    web: Any, imke: Any, bottle: str
) -> None:
    mine = script(web, make(imke).json()["token"])
    sent = {"result_id": "W-2026-0417", "used_at": "2026-05-04T10:15:00+02:00"}
    first = mine.post(f"/api/bottles/{bottle}/uses", json=sent)
    assert first.status_code == 201, first.text
    line = first.json()
    assert (line["by"], line["by_token"], line["in_force_then"]) == (
        "Imke Thorvald", "titrator PC", True,
    )  # fmt: skip
    card = mine.get(f"/api/bottles/{bottle}").json()
    assert line["certificate"] == card["certificate"]["number"]
    assert mine.post(f"/api/bottles/{bottle}/uses", json=sent).json()["id"] == line["id"]
    other = mine.post(f"/api/bottles/{bottle}/uses", json={**sent, "used_at": "2026-05-04T10:16"})
    assert (other.status_code, other.json()["field"]) == (409, "result_id")
    odd = mine.post(f"/api/bottles/{bottle}/uses", json={**sent, "amount": 1})
    assert (odd.status_code, odd.json()["field"]) == (422, "amount")


@pytest.mark.parametrize(
    "header",
    ["Bearer tl_" + "x" * 43, "Bearer ", "Bearer " + "x" * 5000, "bearer tl_", "Bearer a b c"],
)
def test_token_that_does_not_hold_opens_nothing_not_even_what_a_visitor_sees(
    web: Any, header: str, bottle: str
) -> None:
    visitor = web.visitor()
    for url in (
        f"/api/bottles/{bottle}",
        "/",
        f"/b/{bottle}",
        "/api/shelf",
        "/me",
        "/shelf/list.csv",
    ):
        answer = visitor.get(url, headers={"Authorization": header})
        assert answer.status_code == 401, url
        assert answer.headers["content-type"] == "application/problem+json"
        assert answer.headers["www-authenticate"].startswith("Bearer ")
        assert "concentration" not in answer.text


def test_token_revoked_expired_or_of_a_closed_account_ends_at_the_next_request(
    web: Any, imke: Any, bottle: str
) -> None:
    first, second, third = (make(imke, days=days).json() for days in (30, 1, 30))
    url = f"/api/bottles/{bottle}"

    def status(made: Any) -> int:
        code: int = script(web, made["token"]).get(url).status_code
        return code

    assert [status(one) for one in (first, second, third)] == [200] * 3
    imke.post(f"/api/tokens/{first['id']}/revoke")
    assert [status(one) for one in (first, second, third)] == [401, 200, 200]
    web.clock.at += timedelta(days=1)
    assert [status(one) for one in (first, second, third)] == [401, 401, 200]
    marisol = web.client("marisol")
    people = marisol.get("/api/people").json()["people"]
    person = next(one["id"] for one in people if one["sign_in_name"] == "imke")
    marisol.post(f"/api/people/{person}/close", {"reason": "left"})
    assert status(third) == 401


def test_token_does_no_more_than_the_roles_that_its_person_still_has(
    web: Any, imke: Any, bottle: str
) -> None:
    mine = script(web, make(imke).json()["token"])
    marisol = web.client("marisol")
    row = next(
        one for one in marisol.get("/api/people").json()["people"] if one["sign_in_name"] == "imke"
    )
    marisol.post(
        f"/api/people/{row['id']}/roles", {"roles": ["reader"], "revision": row["revision"]}
    )
    refused = mine.post(f"/api/bottles/{bottle}/uses", json={"result_id": "W-1"})
    assert refused.status_code == 403
    assert mine.get(f"/api/bottles/{bottle}").status_code == 200


def test_token_beside_a_session_is_only_the_token(web: Any, imke: Any, bottle: str) -> None:
    token = make(imke, scopes=["look up"]).json()["token"]
    with_both = {"Authorization": f"Bearer {token}"}
    assert imke.get("/api/session", headers=with_both).status_code == 403
    hold = {"kind": "bottle", "thing": bottle, "reason": "x"}
    assert imke.post("/api/holds", hold, **with_both).status_code == 403


def test_write_with_a_token_from_another_site_is_refused(web: Any, imke: Any, bottle: str) -> None:
    mine = script(web, make(imke).json()["token"])
    answer = mine.post(
        f"/api/bottles/{bottle}/uses", json={"result_id": "W-1"},
        headers={"Origin": "https://elsewhere.example", "Sec-Fetch-Site": "cross-site"},
    )  # fmt: skip
    assert answer.status_code == 403


def test_closed_shelf_opens_to_a_token(web: Any, imke: Any, bottle: str) -> None:
    token = make(imke, scopes=["look up"]).json()["token"]
    marisol = web.client("marisol")
    kept = marisol.get("/api/people").json()
    settings = {
        "name": kept["laboratory"], "address": kept["address"], "zone": kept["zone"],
        "revision": kept["revision"], "shelf_open": False,
    }  # fmt: skip
    assert marisol.post("/api/laboratory", settings).status_code == 200
    assert web.visitor().get(f"/api/bottles/{bottle}").status_code == 401
    assert script(web, token).get(f"/api/bottles/{bottle}").status_code == 200


def test_list_for_a_script_is_the_list_of_the_page(web: Any, imke: Any) -> None:
    mine = script(web, make(imke, scopes=["export"]).json()["token"])
    for url in ("/shelf/list.csv", "/lots/list.csv"):
        assert mine.get(url).content == imke.get(url).content
