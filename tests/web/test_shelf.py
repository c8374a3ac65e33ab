"""The shelf over HTTP: codes and their typos, the camera's permission, filters, watches, pulls."""

import re
from datetime import timedelta
from typing import Any

import pytest


def code_of(web: Any) -> str:
    code: str = web.demo.bottles_in_force[1]
    return code


def test_words_that_are_a_code_or_a_scanned_address_lead_to_the_card(shared_web: Any) -> None:
    visitor, code = shared_web.visitor(), code_of(shared_web)
    for words in (code, code.lower(), f" {code[:4]} {code[4:]} ", f"https://x.example/b/{code}"):
        answer = visitor.get("/", params={"words": words})
        assert (answer.status_code, answer.headers["location"]) == (303, f"/b/{code}")
    assert visitor.get("/", params={"words": "naoh 0.1"}).status_code == 200


def test_typo_in_a_code_offers_the_nearest_as_links(shared_web: Any) -> None:
    visitor, code = shared_web.visitor(), code_of(shared_web)
    wrong = code[:2] + code[3] + code[2] + code[4:]
    assert wrong != code
    page = visitor.get(f"/b/{wrong}")
    assert page.status_code == 404
    assert f'href="/b/{code}"' in page.text
    found = visitor.get(f"/api/bottles/{wrong}")
    assert (found.status_code, found.json()["shown"]["nearest"]) == (404, [code])
    assert f'href="/b/{code}"' in visitor.get("/", params={"words": wrong}).text
    lot = shared_web.client("rosa").get(f"/lots/{wrong}")
    assert f'href="/lots/{code}"' in lot.text


def test_camera_may_be_asked_for_where_codes_are_scanned_and_nowhere_else(shared_web: Any) -> None:
    rosa, code = shared_web.client("rosa"), code_of(shared_web)
    for url in ("/", f"/b/{code}"):
        page = rosa.get(url)
        assert "camera=(self)" in page.headers["permissions-policy"]
        assert "data-scan hidden" in page.text  # shown by the script alone, where it works
        assert 'name="words"' in page.text
    for url in (
        "/lots",
        "/trail",
        "/notices",
        "/me",
        f"/api/bottles/{code}",
        "/health",
        "/b/00000000",
    ):
        policy = rosa.get(url).headers["permissions-policy"]
        assert "camera=()" in policy, url
    assert "geolocation=()" in rosa.get("/").headers["permissions-policy"]


def test_shelf_is_narrowed_by_state_titrant_and_place_together(shared_web: Any) -> None:
    rosa = shared_web.client("rosa")
    every = rosa.get("/api/shelf").json()
    assert {"HCl", "NaOH"} <= set(every["titrants"])
    some = rosa.get("/api/shelf", params={"titrant": "NaOH", "state": "in force"}).json()
    wanted = [
        one["code"] for one in every["bottles"]
        if one["titrant"] == "NaOH" and one["state"] == "in force"
    ]  # fmt: skip
    assert [one["code"] for one in some["bottles"]] == wanted
    assert wanted
    nowhere = rosa.get("/", params={"place": "<nowhere>"})
    assert "No bottle answers to this." in nowhere.text
    assert "<nowhere>" not in nowhere.text
    csv = rosa.get("/shelf/list.csv", params={"titrant": "HCl"}).text
    assert "NaOH" not in csv


def test_lots_come_due_soonest_first_and_are_narrowed_by_titrant(shared_web: Any) -> None:
    rosa = shared_web.client("rosa")
    lots = rosa.get("/api/lots").json()["lots"]
    usable = [one["state"] in {"in force", "check due"} for one in lots]
    assert usable == sorted(usable, reverse=True)
    assert [one["state"] for one in lots][:2] == ["check due", "in force"]
    only = rosa.get("/api/lots", params={"titrant": "HCl"}).json()["lots"]
    assert {one["titrant"] for one in only} == {"HCl"}
    assert rosa.get("/lots", params={"titrant": "HCl"}).status_code == 200


def test_visitor_sees_no_uses_watches_or_names(shared_web: Any) -> None:
    code = code_of(shared_web)
    page = shared_web.visitor().get(f"/b/{code}").text
    for words in ("Used for", "Watch this", "Where it stands now", "/notices"):
        assert words not in page
    for url in (f"/api/bottles/{code}/uses", "/api/notices", "/notices", f"/lots/{code}/uses.csv"):
        assert shared_web.visitor().get(url).status_code == 401


def test_pulled_lot_turns_every_page_and_answer_at_the_next_request(web: Any) -> None:
    jonas, cleo, imke, visitor = (*map(web.client, ("jonas", "cleo", "imke")), web.visitor())
    code = code_of(web)
    lot = imke.get(f"/api/lots/{code}").json()["code"]
    number = visitor.get(f"/api/bottles/{code}").json()["concentration"]["reported"].split()[0]
    imke.post("/api/watches", {"kind": "bottle", "thing": code})
    use = {"result_id": "W-2026-0417"}
    assert imke.post(f"/api/bottles/{code}/uses", use).status_code == 201
    web.clock.at += timedelta(minutes=1)
    jonas.post(f"/api/lots/{lot}/propose-pull", {"reason": "wrong standard"})
    cleo.post(f"/api/lots/{lot}/confirm-pull")

    found = visitor.get(f"/api/bottles/{code}").json()
    assert (found["state"], found["in_force"], found["concentration"]) == ("pulled", False, None)
    plain = visitor.get(f"/api/bottles/{code}", headers={"Accept": "text/plain"}).text
    assert plain == "not in force: pulled\n"
    for page in (visitor.get(f"/b/{code}").text, visitor.get("/").text, imke.get("/").text):
        assert number not in page
    assert code not in visitor.get("/shelf/list.csv").text
    assert number not in visitor.get("/api/shelf").text
    page = imke.get(f"/lots/{lot}").text
    assert "W-2026-0417" in page
    assert "since it was pulled" in page
    assert "1 use since" in page  # from the certificate on that stood last, without being asked
    (notice,) = imke.get("/api/notices").json()["notices"]
    assert (notice["state"], notice["unread"]) == ("pulled", True)
    csv = imke.get(f"/lots/{lot}/uses.csv").text
    assert "W-2026-0417" in csv


def test_count_of_notices_stands_on_every_page_until_they_are_read(web: Any) -> None:
    rosa, jonas, code = web.client("rosa"), web.client("jonas"), code_of(web)
    rosa.form("/watch", kind="bottle", thing=code)
    assert "not read" not in rosa.get("/about").text
    web.clock.at += timedelta(seconds=1)
    jonas.post("/api/holds", {"kind": "bottle", "thing": code, "reason": "<i>cloudy</i>"})
    for url in ("/about", "/", "/me"):
        assert re.search(r'class="count">1<span class="unseen"> not read', rosa.get(url).text), url
    page = rosa.get("/notices").text
    assert "&lt;i&gt;cloudy&lt;/i&gt;" in page
    (until,) = re.findall(r'name="until" value="([^"]+)"', page)
    assert rosa.form("/notices/read", until=until).status_code == 303
    assert "not read" not in rosa.get("/about").text
    assert (
        rosa.form("/watch/stop", kind="bottle", thing=code, back="notices").headers["location"]
        == "/notices"
    )


@pytest.mark.parametrize("field", ["place", "result_id"])
def test_refused_form_of_a_bottle_is_shown_again_with_what_was_typed(web: Any, field: str) -> None:
    imke, code = web.client("imke"), code_of(web)
    typed = "x" * 90
    url = f"/b/{code}/moved" if field == "place" else f"/b/{code}/uses"
    page = imke.form(url, **{field: typed})
    assert page.status_code == 422
    assert typed in page.text
