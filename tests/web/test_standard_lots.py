"""A standard lot's life by form and over the API; its certificate's file; lists; the planner."""

import hashlib
import re
from datetime import timedelta
from typing import Any
from urllib.parse import parse_qsl

import pytest

PDF = b"%PDF-1.7\n%\xe2\xe3\xcf\xd3 a certificate"
STATED = {
    "name": "KHP lot 12",
    "substance": "KHP",
    "certificate_number": "RM-12",
    "issuer": "producer of the standard",
    "due_on": "2028-05-31",
    "due_basis": "certificate",
    "basis": "dried",
    "mass_fraction_value": "0,9999",
    "mass_fraction_statement": "U",
    "mass_fraction_bound": "0,0004",
    "mass_fraction_k": "2",
    "minimum_sample_g": "0,2",
    "storage": "desiccator",
    "received_g": "25,0",
    "period_after_opening": "12 months",
    "drying": "2 h at 115 °C",
    "drying_demand_low_C": "110",
    "drying_demand_high_C": "120",
    "drying_demand_hours": "2",
    "drying_demand_desiccator": "yes",
}


def send(hand: Any, url: str, files: dict[str, Any] | None = None, **fields: str) -> Any:
    sent = {"form_token": hand.token, "key": fields.pop("key", url), **fields}
    return hand.client.post(url, data=sent, files=files)


def received(jonas: Any, **more: str) -> str:
    files = {"certificate_file": ("RM-12.pdf", PDF, "text/html")}
    answer = send(jonas, "/stores/standard-lots/new", files=files, **STATED, **more)
    assert answer.status_code == 303, answer.text
    return answer.headers["location"]


def test_reception_keeps_every_statement_and_the_file(web: Any) -> None:
    jonas = web.client("jonas")
    page = received(jonas)
    told = jonas.get(f"/api{page.removeprefix('/stores')}").json()

    facts = {one["label"]: one["value"] for one in told["facts"]}
    assert facts["Smallest sample"] == "0.2 g"
    assert facts["Came"] == "25.0 g"
    assert facts["Good after opening for"] == "12 months"
    assert told["drying_asked"] == "2 h at 115 °C (110 to 120 °C, 2 h, cooled in a desiccator)"
    assert told["file"]["sha256"] == hashlib.sha256(PDF).hexdigest()
    assert told["left"] == "25.0 g"


def test_certificate_file_is_handed_out_as_it_came_and_never_as_a_page(web: Any) -> None:
    jonas = web.client("jonas")
    page = received(jonas)
    url = jonas.get(f"/api{page.removeprefix('/stores')}").json()["file"]["url"]
    answer = jonas.get(url)

    assert answer.content == PDF
    # what the browser said of its kind counts for nothing
    assert answer.headers["content-type"] == "application/pdf"
    assert answer.headers["content-disposition"].startswith('attachment; filename="RM-12.pdf"')
    assert "sandbox" in answer.headers["content-security-policy"]
    assert "script-src" not in answer.headers["content-security-policy"]
    assert answer.headers["x-content-type-options"] == "nosniff"
    assert answer.headers["cache-control"] == "no-store"
    assert answer.headers["repr-digest"].startswith("sha-256=:")
    assert web.visitor().get(url).status_code == 401
    assert jonas.get(f"/api{url}").content == PDF


def test_file_that_is_not_kept_shows_the_form_again_with_what_was_typed(web: Any) -> None:
    jonas = web.client("jonas")
    files = {"certificate_file": ("RM-12.pdf", b"MZ\x90\x00 no paper", "application/pdf")}
    answer = send(jonas, "/stores/standard-lots/new", files=files, **STATED)

    assert answer.status_code == 422
    assert "none of the kinds that are kept" in answer.text
    assert 'value="KHP lot 12"' in answer.text
    assert "Choose it again, please." in answer.text


@pytest.mark.parametrize(
    "body",
    [
        b"no boundary at all",
        b'--x\r\nContent-Disposition: form-data; name="a"\r\n\r\n\xff\xfe\r\n--x--\r\n',
        b"--x\r\nContent-Disposition: form-data\r\n\r\na\r\n--x--\r\n",
        b"--x" * 2000,
    ],
)
def test_form_with_files_that_cannot_be_read_is_refused(shared_web: Any, body: bytes) -> None:
    jonas = shared_web.client("jonas")
    headers = {"Content-Type": "multipart/form-data; boundary=x"}
    answer = jonas.client.post("/stores/standard-lots/new", content=body, headers=headers)

    assert answer.status_code in {400, 403}, answer.text


def test_too_large_a_file_is_refused_before_it_is_read(shared_web: Any) -> None:
    jonas = shared_web.client("jonas")
    files = {"certificate_file": ("a.pdf", b"%PDF-" + b"x" * 3_000_000, "application/pdf")}
    answer = send(jonas, "/stores/standard-lots/new", files=files, **STATED)

    assert answer.status_code == 413


def test_file_without_the_token_of_the_session_is_refused(shared_web: Any) -> None:
    jonas = shared_web.client("jonas")
    files = {"certificate_file": ("a.pdf", PDF, "application/pdf")}
    sent = {"form_token": "x", "key": "k", **STATED}
    answer = jonas.client.post("/stores/standard-lots/new", data=sent, files=files)

    assert answer.status_code == 403


def test_life_of_a_lot_by_its_forms(web: Any) -> None:
    jonas, imke = web.client("jonas"), web.client("imke")
    page = received(jonas)
    told = f"/api{page.removeprefix('/stores')}"

    assert imke.form(f"{page}/opened", opened_day="2026-05-04").status_code == 303
    dried = {
        "drying_ended_at": "2026-05-04T10:00",
        "drying_temperature": "115,5",
        "drying_hours": "2",
        "drying_desiccator": "yes",
    }
    assert imke.form(f"{page}/dryings", **dried).status_code == 303
    use = {"use_mass_g": "0,5", "use_says": "loss on drying"}
    assert imke.form(f"{page}/uses", **use).status_code == 303
    found = imke.get(told).json()
    assert found["due_rule"] == "period after opening, 12 months from 2026-05-04"
    assert found["dryings"][0]["says"] == "115.5 °C, 2 h, desiccator"
    assert found["drying_now"]["verdict"] == "holds"
    assert found["left"] == "24.5 g"

    strike = {"strike_line_id": found["uses"][0]["line_id"], "strike_reason": "another lot"}
    assert imke.form(f"{page}/strike", **strike).status_code == 303
    web.clock.at += timedelta(minutes=1)
    assert imke.form(f"{page}/counts", count_mass_g="24,9").status_code == 303
    retest = {
        "retest_done_on": "2026-05-04",
        "retest_next_on": "2026-11-30",
        "retest_says": "unchanged",
    }
    assert jonas.form(f"{page}/retests", **retest).status_code == 303
    found = imke.get(told).json()
    assert found["left"] == "24.9 g"
    assert found["due_rule"] == "re-test day"
    assert [one["struck"] != "" for one in found["uses"]] == [False, True]
    html = imke.get(page).text
    assert "<s>0.5 g</s>" in html
    assert "another lot" in html


def test_refused_line_stands_open_with_what_was_typed(web: Any) -> None:
    imke, page = web.client("imke"), received(web.client("jonas"))
    answer = imke.form(f"{page}/uses", use_mass_g="26", use_says="all of it & more")

    assert answer.status_code == 422
    assert "Only 25.0 g" in answer.text
    assert 'value="all of it &amp; more"' in answer.text
    assert 'aria-invalid="true"' in answer.text
    # that form alone stands open
    assert answer.text.count('<details class="write" open>') == 1


def test_line_sent_twice_with_one_key_is_written_once(web: Any) -> None:
    imke, page = web.client("imke"), received(web.client("jonas"))
    use = {"use_mass_g": "0.5", "use_says": "x"}
    for _ in range(2):
        assert imke.form(f"{page}/uses", key="one", **use).status_code == 303
    told = imke.get(f"/api{page.removeprefix('/stores')}").json()
    assert len(told["uses"]) == 1


def test_life_of_a_lot_over_the_api(web: Any) -> None:
    jonas, page = web.client("jonas"), received(web.client("jonas"))
    lot = f"/api{page.removeprefix('/stores')}"

    drying = {"ended_at": "2026-05-04T08:00:00+00:00", "temperature": "115", "hours": "2"}
    answer = jonas.post(f"{lot}/dryings", drying)
    assert (answer.status_code, answer.headers["location"]) == (201, lot)
    answer = jonas.post(f"{lot}/dryings", {**drying, "hours": "1,5"})
    assert (answer.status_code, answer.json()["field"]) == (422, "hours")
    answer = jonas.post(f"{lot}/dryings", {**drying, "oven": "2"})
    assert (answer.status_code, answer.json()["field"]) == (422, "oven")
    line = jonas.post(f"{lot}/uses", {"mass_g": "1", "says": "moisture"}).json()["id"]
    assert jonas.post(f"{lot}/strike", {"line_id": line, "reason": "x"}).status_code == 200
    body = {"file_name": "n.pdf", "content_base64": "JVBERi0x", "reason": "blurred"}
    file = jonas.post(f"{lot}/certificate", body)
    assert file.status_code == 201
    assert jonas.get(file.json()["url"]).content == b"%PDF-1"


def test_lists_are_files_with_the_filters_of_their_pages(shared_web: Any) -> None:
    imke, visitor = shared_web.client("imke"), shared_web.visitor()
    answer = imke.get("/shelf/list.csv?words=naoh&state=lapsed")

    assert answer.headers["content-type"] == "text/csv; charset=utf-8"
    assert 'filename="shelf-2026-05-04.csv"' in answer.headers["content-disposition"]
    assert answer.text.count("lapsed") == answer.text.count("\r\n") - 1 > 0
    assert "lapsed" not in visitor.get("/shelf/list.csv").text
    assert visitor.get("/trail/list.csv").status_code == 401
    assert imke.get("/trail/list.csv?day=soon").status_code == 422
    of_keeper = imke.get("/trail/list.csv", params={"person": "Jonas Halework"}).text
    assert "Imke Thorvald" not in of_keeper
    assert "received a standard lot" in of_keeper


def narrowed(page: str, path: str) -> dict[str, str]:
    """By what a page's link to its list as a file is narrowed."""
    (query,) = re.findall(rf'href="{path}(?:\?([^"]*))?"', page)
    return dict(parse_qsl(query.replace("&amp;", "&")))


def test_pages_link_their_lists_with_what_is_filtered(shared_web: Any) -> None:
    imke = shared_web.client("imke")
    for asked, path, by in (
        ("/?words=naoh 0.1&state=lapsed", "/shelf/list.csv",
         {"words": "naoh 0.1", "state": "lapsed"}),
        ("/lots?state=held", "/lots/list.csv", {"state": "held"}),
        ("/stores", "/stores/standard-lots/list.csv", {}),
        ("/instruments", "/instruments/list.csv", {}),
        ("/trail?thing=KHP", "/trail/list.csv", {"thing": "KHP"}),
    ):  # fmt: skip
        assert narrowed(imke.get(asked).text, path) == by, asked


def test_planner_page_and_api_tell_the_same(shared_web: Any) -> None:
    imke = shared_web.client("imke")
    told = imke.get("/api/planner?wanted_percent=0.09").json()
    html = imke.get("/planner?wanted_percent=0.09").text

    assert told["plan"]["says"] in html
    assert told["plan"]["chart"] in html
    assert 'value="0.09"' in html


@pytest.mark.parametrize(
    ("asked", "says"),
    [
        ("mass_g=9", "the burette holds 25 mL"),
        ("mass_g=much", "mass_g"),
        ("mass_g=-1", "between 0 and 1000"),
        ("replicates=0", "whole number from 1 to 20"),
        ("replicates=x", "whole number"),
        ("wanted_percent=0", "above zero"),
        ("wanted_percent=1e400", "wanted_percent"),
        ("mass_g=%3Cscript%3E", "&lt;script&gt;"),
    ],
)
def test_planner_odd_number_is_refused_in_words_beside_a_plan(
    shared_web: Any, asked: str, says: str
) -> None:
    imke = shared_web.client("imke")
    answer = imke.get(f"/planner?{asked}")

    assert answer.status_code == 422
    assert says in answer.text
    assert "<script>" not in answer.text
    assert "is to be expected" in answer.text
    assert imke.get(f"/api/planner?{asked}").status_code == 422


def test_planner_with_unknown_things_proposes_its_own(shared_web: Any) -> None:
    answer = shared_web.client("imke").get("/planner?recipe_id=x&balance_id=y&standard_lot_id=z")

    assert answer.status_code == 200
    assert "is to be expected" in answer.text
