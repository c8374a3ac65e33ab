"""R022, R076, R077, R119: labels chosen, printed, scanned, printed again with a reason."""

import io
import json
from typing import Any
from urllib.parse import urlsplit

import pypdf
import pytest
import zxingcpp
from PIL import Image

from server.lab.codes import new_code

CLEAN = "62x40"


@pytest.fixture
def bottle(web: Any) -> str:
    """A bottle of the lye in force, which has a standing certificate."""
    code: str = web.demo.bottles_in_force[1]
    return code


def _print(hand: Any, *bottles: str, **more: Any) -> Any:
    return hand.post("/api/labels", {"bottles": list(bottles), "stock": CLEAN, **more})


def _printed(hand: Any, *bottles: str, **more: Any) -> int:
    answer = _print(hand, *bottles, **more)
    assert answer.status_code == 201, answer.text
    number: int = answer.json()["number"]
    return number


def _text(hand: Any, number: int) -> str:
    pdf = hand.get(f"/labels/prints/{number}.pdf").content
    pages = pypdf.PdfReader(io.BytesIO(pdf)).pages
    joined = " ".join(page.extract_text() for page in pages).replace("\u200b", "")
    return " ".join(joined.split())


def _settings(web: Any, **changes: Any) -> None:
    marisol = web.client("marisol")
    kept = marisol.get("/api/laboratory").json()
    given = {
        "name": kept["laboratory"],
        "address": kept["address"],
        "zone": kept["zone"],
        "shelf_open": True,
        "revision": kept["revision"],
    }
    answer = marisol.post("/api/laboratory", {**given, **changes})
    assert answer.status_code == 200, answer.text


def _lot_of(hand: Any, bottle: str) -> Any:
    return hand.get(f"/api/labels?thing={bottle}").json()


@pytest.mark.parametrize(("stock", "dots"), [("62x40", 203), ("50x30", 300), ("a4-21", 203)])
def test_printed_label_is_scanned_and_leads_a_visitor_to_the_bottle(
    web: Any, bottle: str, stock: str, dots: int
) -> None:
    """The picture is decoded by zxing-cpp; its address is opened as it stands in the code."""
    _settings(web, base_url="https://testserver/")
    number = _printed(web.client("imke"), bottle, stock=stock, dots_per_inch=dots)

    answer = web.client("rosa").get(f"/labels/prints/{number}.png")

    assert answer.headers["content-type"] == "image/png"
    (found,) = zxingcpp.read_barcodes(Image.open(io.BytesIO(answer.content)))
    assert found.format == zxingcpp.BarcodeFormat.QRCode
    assert found.text == f"HTTPS://TESTSERVER/B/{bottle}"
    page = web.visitor().get(urlsplit(found.text).path)
    assert page.status_code == 200
    assert f"bottle {bottle}" in page.text


def test_label_bears_no_certified_number_by_default(web: Any, bottle: str) -> None:
    imke = web.client("imke")
    value = imke.get(f"/api/bottles/{bottle}").json()["concentration"]["reported"].split()[0]

    says = _text(imke, _printed(imke, bottle))

    assert value not in says
    assert "nominal 0.1 mol/L" in says
    assert f"{bottle[:4]} {bottle[4:]}" in says
    assert "Tarnbeck Waterworks" in says


def test_label_without_an_own_address_leads_to_where_the_page_was_opened(
    web: Any, bottle: str
) -> None:
    imke = web.client("imke")
    assert "own address is not set" in imke.get(f"/labels?thing={bottle}").text

    job = imke.get(f"/api/labels/{_printed(imke, bottle)}").json()

    assert job["onto"]["base_url"] == "https://testserver"


def test_label_is_printed_again_only_with_a_reason_which_stands_in_the_log(
    web: Any, bottle: str
) -> None:
    imke = web.client("imke")
    _printed(imke, bottle)

    refused = _print(imke, bottle)
    assert refused.status_code == 422
    assert refused.json()["field"] == "reason"
    assert bottle in refused.json()["detail"]
    number = _printed(imke, bottle, reason="lost in the wash")

    assert "lost in the wash" in _text(imke, number)
    assert "lost in the wash" in imke.get(f"/labels?thing={bottle}").text
    prints = _lot_of(imke, bottle)["prints"]
    assert [one["reason"] for one in prints] == ["lost in the wash", ""]
    lines = imke.get(f"/api/trail?thing={bottle}").json()["lines"]
    assert [one["why"] for one in lines if one["act"] == "printed a label"] == [
        "lost in the wash",
        None,
    ]


def test_print_sent_twice_under_one_key_is_one_print(web: Any, bottle: str) -> None:
    imke = web.client("imke")
    sent = {"bottles": [bottle], "stock": CLEAN}
    headers = {"Idempotency-Key": "the same"}

    first = imke.post("/api/labels", sent, **headers)
    again = imke.post("/api/labels", sent, **headers)

    assert first.json() == again.json()
    assert len(_lot_of(imke, bottle)["prints"]) == 1


def test_print_is_the_same_bytes_whatever_is_changed_later(web: Any, bottle: str) -> None:
    imke = web.client("imke")
    number = _printed(imke, bottle)
    before = imke.get(f"/labels/prints/{number}.pdf").content

    _settings(web, name="Another laboratory", base_url="https://elsewhere.example")

    assert imke.get(f"/labels/prints/{number}.pdf").content == before
    assert imke.get(f"/api/labels/{number}.pdf").content == before


def test_labels_of_several_bottles_are_one_print_in_the_order_chosen(web: Any) -> None:
    jonas = web.client("jonas")
    codes = [one["code"] for one in _lot_of(jonas, web.demo.bottles_in_force[1])["bottles"]]
    chosen = list(reversed(codes))

    number = _printed(jonas, *chosen, stock="a4-14", first_place=3)

    job = jonas.get(f"/api/labels/{number}").json()
    assert [one["code"] for one in job["texts"]] == chosen
    assert job["onto"]["first_place"] == 3
    assert jonas.get(f"/labels/prints/{number}").text.count('<th scope="row"') == len(chosen)


def test_value_on_labels_asks_for_new_ones_when_its_certificate_is_replaced(
    web: Any, bottle: str
) -> None:
    """R022: the old printed value is flagged, bottle by bottle."""
    _settings(web, label_value=True)
    imke = web.client("imke")
    number = _printed(imke, bottle)
    certificate = imke.get(f"/api/bottles/{bottle}").json()["certificate"]["number"]
    says = _text(imke, number)
    value = imke.get(f"/api/bottles/{bottle}").json()["concentration"]["reported"].split()[0]
    assert value in says
    assert certificate in says
    assert imke.get("/api/labels").json()["bottles"] == []

    _forge_print_with_certificate(web, bottle, "TL-2026-0004")

    (due,) = imke.get("/api/labels").json()["bottles"]
    assert due["code"] == bottle
    assert "TL-2026-0004, which TL-2026-0005 replaced" in due["again"]
    assert "To be printed again" in imke.get("/labels").text
    assert due["again"] in imke.get(f"/b/{bottle}").text
    assert "Its label bears" not in web.visitor().get(f"/b/{bottle}").text


def _forge_print_with_certificate(web: Any, bottle: str, number: str) -> None:
    """Note in the trail that a label was printed while an older certificate stood."""
    from server.lab.actor import Actor
    from server.records.queries.list_labels import LABEL_PRINTED, labels_of_bottles
    from server.records.queries.load_lots import bottle_by_code
    from server.records.trail import note

    actor = Actor("00000000-0000-4000-8000-000000000000", "Nobody", "N", frozenset(), "UTC")

    def work(session: Any) -> None:
        row = bottle_by_code(session, bottle)
        label = labels_of_bottles(session, [row.id])[0].text.kept()
        label["value"]["certificate"] = number
        onto = {"stock": CLEAN, "base_url": "https://x", "first_place": 1, "dots_per_inch": 300}
        body = {"place": 1, "of": 1, "onto": onto, "label": label}
        note(
            session, actor=actor, act=LABEL_PRINTED, kind="bottle", thing_id=row.id,
            thing_name=bottle, why=None, body=body, now=web.clock(), zone="UTC",
        )  # fmt: skip

    web.transactions.write(work)


def test_value_is_on_no_label_of_a_bottle_that_is_not_in_force(web: Any, bottle: str) -> None:
    _settings(web, label_value=True)
    imke = web.client("imke")
    held = next(one for one in _lot_of(imke, bottle)["bottles"] if one["state"] == "held")["code"]
    value = imke.get(f"/api/bottles/{bottle}").json()["concentration"]["reported"].split()[0]

    assert value not in _text(imke, _printed(imke, held))


def test_bottle_that_is_used_up_or_pulled_gets_no_label(web: Any, bottle: str) -> None:
    imke = web.client("imke")
    gone = _lot_of(imke, bottle)["no_label"]
    assert gone in web.demo.bottles

    assert _print(imke, gone).status_code == 403
    lot = _lot_of(imke, bottle)["lot_code"]
    web.client("jonas").post(f"/api/lots/{lot}/propose-pull", {"reason": "wrong salt"})
    web.client("cleo").post(f"/api/lots/{lot}/confirm-pull")

    refused = _print(imke, bottle)
    assert refused.status_code == 403
    assert "its lot was pulled" in refused.json()["detail"]
    assert _lot_of(imke, bottle)["bottles"] == []


@pytest.mark.parametrize(
    ("given", "field"),
    [
        ({"stock": "teapot"}, "stock"),
        ({"stock": "41x25"}, "stock"),
        ({"stock": "a4-8", "first_place": 9}, "first_place"),
        ({"dots_per_inch": 9}, "dots_per_inch"),
        ({"bottles": []}, "bottles"),
        ({"reason": "a" * 1001}, "reason"),
        ({"colour": "pink"}, "colour"),
    ],
)
def test_print_that_cannot_be_is_refused_by_field_and_not_written_down(
    shared_web: Any, given: dict[str, Any], field: str
) -> None:
    imke, code = shared_web.client("imke"), shared_web.demo.bottles_in_force[0]

    answer = imke.post("/api/labels", {"bottles": [code], "stock": CLEAN, **given})

    assert answer.status_code == 422, answer.text
    assert answer.json()["field"] == field
    assert _lot_of(imke, code)["prints"] == []


def test_print_for_a_code_that_nothing_has_is_not_found(shared_web: Any) -> None:
    from random import Random

    imke = shared_web.client("imke")

    assert _print(imke, new_code(Random(5))).status_code == 404
    assert imke.get("/labels?thing=NOCODE00").status_code == 404
    for url in ("/labels/prints/1", "/labels/prints/999999", "/labels/prints/1.pdf"):
        assert imke.get(url).status_code == 404, url
    assert imke.get("/labels/prints/99999999999999999999").status_code in {404, 422}


def test_form_that_was_refused_keeps_what_was_chosen_and_typed(web: Any, bottle: str) -> None:
    imke = web.client("imke")
    lot = _lot_of(imke, bottle)["lot_code"]

    answer = imke.form(
        "/labels", thing=lot, bottles=bottle, stock="a4-8", first_place="44", dots_per_inch="300",
        reason="<b>wet</b>",
    )  # fmt: skip

    assert answer.status_code == 422
    assert f'value="{bottle}" checked' in answer.text
    assert 'value="44"' in answer.text
    assert 'value="&lt;b&gt;wet&lt;/b&gt;"' in answer.text
    assert '<option value="a4-8" selected>' in answer.text


def test_form_prints_and_leads_to_the_print(web: Any, bottle: str) -> None:
    imke = web.client("imke")
    answer = imke.form(
        "/labels", thing=bottle, bottles=bottle, stock="100x50", size="80x40", first_place="1",
        dots_per_inch="203", reason="<i>wet</i> & torn",
    )  # fmt: skip

    assert answer.status_code == 303
    page = imke.get(answer.headers["location"])
    assert page.status_code == 200
    assert "onto one label, 80 × 40 mm, 203 dots per inch" in page.text


def test_hazards_are_on_labels_only_of_the_solution_that_was_confirmed(
    web: Any, bottle: str
) -> None:
    marisol, imke = web.client("marisol"), web.client("imke")
    assert "GHS05" not in json.dumps(imke.get(f"/api/labels/{_printed(imke, bottle)}").json())
    confirmed = {
        "titrant": "NaOH", "nominal": "0.10", "pictograms": ["GHS05"], "signal_word": "Warning",
        "statements": "H290 May be corrosive to metals.", "confirmed_by": "Jonas Halework",
        "confirmed_on": "2026-04-30",
    }  # fmt: skip
    kept = marisol.get("/api/laboratory").json()["revision"]
    answer = marisol.post("/api/laboratory/hazards", {**confirmed, "revision": kept})
    assert answer.status_code == 200, answer.text

    number = _printed(imke, bottle, reason="hazards confirmed", stock="100x50")

    says = _text(imke, number)
    assert "Warning" in says
    assert "H290 May be corrosive to metals." in says
    assert "Confirmed 30 Apr 2026, Jonas Halework." in says
    other = web.demo.bottles_in_force[0]
    assert "Confirmed" not in _text(imke, _printed(imke, other, stock="100x50"))
    again = {"titrant": "NaOH", "nominal": "0.1", "reason": "classified anew", "revision": kept + 1}
    assert marisol.post("/api/laboratory/hazards/withdraw", again).status_code == 200
    assert marisol.get("/api/laboratory").json()["hazards"] == []
    assert "none" in _lot_of(imke, bottle)["hazards_says"]


@pytest.mark.parametrize(
    ("change", "field"),
    [
        ({"pictograms": ["GHS10"]}, "pictograms"),
        ({"signal_word": "Beware"}, "signal_word"),
        ({"confirmed_by": " "}, "confirmed_by"),
        ({"confirmed_on": "2026-05-05"}, "confirmed_on"),
        ({"confirmed_on": "yesterday"}, "confirmed_on"),
        ({"nominal": "0,1"}, "nominal"),
        ({"nominal": "-1"}, "nominal"),
        ({"pictograms": [], "signal_word": "", "statements": " "}, "statements"),
        ({"statements": "x" * 601}, "statements"),
    ],
)
def test_confirmation_that_cannot_be_is_refused_by_field(
    shared_web: Any, change: dict[str, Any], field: str
) -> None:
    marisol = shared_web.client("marisol")
    usual = {
        "titrant": "NaOH", "nominal": "0.1", "pictograms": ["GHS05"], "signal_word": "Danger",
        "confirmed_by": "Jonas Halework", "confirmed_on": "2026-05-04",
        "revision": marisol.get("/api/laboratory").json()["revision"],
    }  # fmt: skip

    answer = marisol.post("/api/laboratory/hazards", {**usual, **change})

    assert answer.status_code == 422
    assert answer.json()["field"] == field
    assert marisol.get("/api/laboratory").json()["hazards"] == []


@pytest.mark.parametrize(
    ("change", "field"),
    [
        ({"paper": "a5"}, "paper"),
        ({"country": "Switzerland"}, "country"),
        ({"country": "Ċ1"}, "country"),
        ({"base_url": "ftp://x"}, "base_url"),
        ({"base_url": "https://x/?a"}, "base_url"),
        ({"base_url": "https://a b"}, "base_url"),
        ({"base_url": "https://u:p@x"}, "base_url"),
        ({"base_url": "https://x:port"}, "base_url"),
        ({"base_url": "https://" + "x" * 300}, "base_url"),
        ({"base_url": "javascript:alert(1)"}, "base_url"),
    ],
)
def test_setting_that_cannot_be_is_refused_by_field(
    shared_web: Any, change: dict[str, Any], field: str
) -> None:
    marisol = shared_web.client("marisol")
    kept = marisol.get("/api/laboratory").json()
    given = {"name": kept["laboratory"], "address": "", "zone": kept["zone"]}

    answer = marisol.post("/api/laboratory", {**given, "revision": kept["revision"], **change})

    assert answer.status_code == 422
    assert answer.json()["field"] == field
    assert marisol.get("/api/laboratory").json() == kept


def test_settings_form_keeps_what_it_does_not_hold_and_takes_what_it_does(web: Any) -> None:
    marisol = web.client("marisol")
    kept = marisol.get("/api/laboratory").json()
    form = {
        "name": kept["laboratory"], "address": kept["address"], "zone": kept["zone"],
        "shelf_open": "yes",
    }  # fmt: skip

    answer = marisol.form(
        "/laboratory", **form, revision="1", labels="shown", label_value="yes", country="de",
        base_url="https://ledger.example/titrants/",
    )  # fmt: skip
    assert answer.status_code == 303
    now = marisol.get("/api/laboratory").json()
    assert (now["country"], now["base_url"], now["label_value"]) == (
        "DE", "https://ledger.example/titrants", True,
    )  # fmt: skip
    assert marisol.form("/laboratory", **form, revision="2").status_code == 303
    later = marisol.get("/api/laboratory").json()
    assert later == {**now, "revision": 3}


def test_settings_form_that_was_refused_keeps_what_was_typed_and_ticked(shared_web: Any) -> None:
    marisol = shared_web.client("marisol")
    form = {"name": "Lower <weir>", "zone": "Europe/Zurich", "address": "", "labels": "shown"}

    answer = marisol.form(
        "/laboratory", **form, revision="1", label_value="yes", country="Helvetia", base_url=""
    )

    assert answer.status_code == 422
    assert 'value="Helvetia"' in answer.text
    assert 'value="Lower &lt;weir&gt;"' in answer.text
    assert 'name="label_value" value="yes" checked' in answer.text
    assert 'name="shelf_open" value="yes" checked' not in answer.text


def test_hazards_form_that_was_refused_stands_open_with_what_was_typed(shared_web: Any) -> None:
    marisol = shared_web.client("marisol")

    answer = marisol.form(
        "/laboratory/hazards", titrant="NaOH", nominal="0,1", medium="water", confirmed_by="",
        confirmed_on="2026-05-01", pictograms=["GHS05", "GHS07"], statements="H290 <metals>",
        revision="1",
    )  # fmt: skip

    assert answer.status_code == 422
    assert '<details class="fold" open><summary>Write down a confirmation' in answer.text
    for key in ("GHS05", "GHS07"):
        assert f'value="{key}" checked' in answer.text
    assert "H290 &lt;metals&gt;</textarea>" in answer.text
    assert 'value="0,1"' in answer.text
    assert 'name="shelf_open" value="yes" checked' in answer.text
