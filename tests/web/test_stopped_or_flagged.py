"""What is not valid is stopped, what is doubtful is flagged: on the page and over the API alike."""

import re
from datetime import timedelta
from typing import Any
from uuid import uuid4

import pytest

#: Potentiometric, TRIS weighed by difference; made up for these tests.
RECIPE = {
    "title": "Hydrochloric acid 0.1 mol/L against TRIS, with a probe",
    "titrant": {"substance": "HCl", "nominal": "0.1", "medium": "water"},
    "standard": "TRIS",
    "weighing": "difference",
    "replicates": 3,
    "end_point": {"mode": "potentiometric"},
    "buoyancy": False,
    "interval_days": 30,
}
#: JIS Z 8802:2011 at 25 °C: 4.01 and 6.86, 59.16 mV by Nernst; 157.0 less 0.2 mV is 93 %.
SLOW = {
    "set": "JIS Z 8802:2011",
    "buffers": [
        {"buffer": "phthalate", "temperature": "25", "mV": "157.0"},
        {"buffer": "phosphate", "temperature": "25", "mV": "0.2"},
    ],
}
PLAN = {"done_on": "2026-05-04", "due_on": "2026-05-11", "due_basis": "weekly"}


def picks(hand: Any) -> dict[str, str]:
    """What a sheet of the acid rests on, the newest recipe first."""
    instruments = {one["name"]: one["id"] for one in hand.get("/api/instruments").json()[
        "instruments"]}  # fmt: skip
    stores = hand.get("/api/stores").json()
    (tris,) = [one["id"] for one in stores["standard_lots"] if "TM-0870" in one["name"]]
    recipes = {one["name"]: one["id"] for one in stores["recipes"]}
    lots = hand.get("/api/sheets").json()["lots"]
    lot = next(one["id"] for one in lots if "HCl" in one["says"])
    return {
        "lot_code": lot,
        "recipe_id": recipes["HCl 0.1 against TRIS"],
        "standard_lot_id": tris,
        "balance_id": instruments["Balance B-2"],
        "burette_id": instruments["Piston burette P-25"],
        "thermometer_id": instruments["Thermometer T-7"],
        "room_id": instruments["Room monitor R-1"],
    }


def refused_both_ways(hand: Any, body: dict[str, str], field: str, says: str) -> None:
    """The API names the field, the page the sentence; nothing is begun."""
    before = len(hand.get("/api/sheets").json()["mine"])
    api = hand.post("/api/sheets", body)
    assert (api.status_code, api.json()["field"]) == (422, field), api.text
    assert says in api.json()["detail"]
    page = hand.form("/bench", **body)
    assert page.status_code == 422
    assert says in page.text
    assert len(hand.get("/api/sheets").json()["mine"]) == before


def test_lapsed_balance_is_stopped_on_page_and_api(web: Any) -> None:
    jonas = web.client("jonas")
    body = picks(web.client("imke"))
    linearity = {"unit": "g", "half_width": "0.0002", "shape": "rectangular"}
    calibration = {
        "certificate_number": "C-1", "issuer": "house", "done_on": "2026-05-04",
        "due_on": "2026-05-04", "due_basis": "daily", "document": {"linearity": linearity},
    }  # fmt: skip
    url = f"/api/instruments/{body['balance_id']}/calibrations"
    assert jonas.post(url, calibration).status_code == 201
    web.clock.at += timedelta(days=1)
    imke = web.client("imke")
    refused_both_ways(imke, body, "balance_id", "it has lapsed")
    begin = imke.get(f"/bench/begin?lot={body['lot_code']}").text
    assert "The calibration of Balance B-2 was good until 2026-05-04" in begin
    listed = imke.get("/api/instruments").json()["instruments"]
    assert {one["state"] for one in listed if one["name"] == "Balance B-2"} == {"lapsed"}
    assert "lapsed" in imke.get(f"/instruments/{body['balance_id']}").text


def test_held_standard_lot_and_held_balance_are_stopped_on_page_and_api(web: Any) -> None:
    imke, jonas = web.client("imke"), web.client("jonas")
    body = picks(imke)
    hold = {"kind": "standard lot", "thing": body["standard_lot_id"], "reason": "jar stood open"}
    assert jonas.post("/api/holds", hold).status_code == 201
    refused_both_ways(imke, body, "standard_lot_id", "is held: jar stood open")
    release = {"kind": "standard lot", "thing": body["standard_lot_id"], "reason": "checked"}
    assert web.client("cleo").post("/api/releases", release).status_code in {200, 204}
    hold = {"kind": "instrument", "thing": body["balance_id"], "reason": "level is off"}
    assert jonas.post("/api/holds", hold).status_code == 201
    refused_both_ways(imke, body, "balance_id", "is held: level is off")


def test_balance_that_failed_its_last_check_is_stopped_on_page_and_api(
    web: Any,
) -> None:
    jonas, imke = web.client("jonas"), web.client("imke")
    body = picks(imke)
    url = f"/api/instruments/{body['balance_id']}"
    limits = {"name": "50 g", "centre": "50.0000", "warning": "0.0003", "action": "0.0005"}
    chart = jonas.post(f"{url}/limits", {"document": limits})
    assert chart.status_code == 201, chart.text

    def check(reading: str) -> None:
        web.clock.at += timedelta(minutes=1)
        given = {"chart": chart.json()["id"], "reading": reading}
        written = imke.post(f"{url}/checks", given)
        assert written.status_code == 201, written.text
        web.clock.at += timedelta(minutes=1)

    check("50.0009")
    says = "The last check weighing of Balance B-2"
    refused_both_ways(imke, body, "balance_id", says)
    assert says in imke.get(f"/bench/begin?lot={body['lot_code']}").text
    page = imke.get(f"/bench/begin?lot={body['lot_code']}&recipe={body['recipe_id']}").text
    assert re.search(rf'value="{body["balance_id"]}"[^>]*disabled', page)
    reason = {"override_reason": "the 50 g weight was dropped"}
    refused_both_ways(imke, body | reason, "balance_id", says)
    let = jonas.post("/api/sheets", body | reason)
    assert let.status_code == 201, let.text
    assert "the 50 g weight was dropped" in imke.get(let.json()["url"]).text
    check("50.0001")
    begun = imke.post("/api/sheets", body)
    assert begun.status_code == 201, begun.text


@pytest.fixture
def flagged(web: Any) -> tuple[Any, str, dict[str, str]]:
    """An analyst with a sheet that uses a probe of 93 % and weighs too little."""
    jonas, imke = web.client("jonas"), web.client("imke")
    made = jonas.post("/api/recipes", {"name": "HCl by probe", "document": RECIPE})
    assert made.status_code == 201, made.text
    probe = {one["name"]: one["id"] for one in jonas.get("/api/instruments").json()[
        "instruments"]}["Probe E-3"]  # fmt: skip
    run = {"run": SLOW, **PLAN}
    bare = jonas.post(f"/api/instruments/{probe}/runs", run)
    assert (bare.status_code, bare.json()["field"]) == (422, "reason")
    assert "probe slope" in bare.json()["detail"]
    reason = {"reason": "the new probe comes on Friday"}
    assert jonas.post(f"/api/instruments/{probe}/runs", run | reason).status_code == 201
    body = picks(imke) | {"recipe_id": made.json()["id"], "probe_id": probe}
    del body["room_id"]
    begun = imke.post("/api/sheets", body)
    assert begun.status_code == 201, begun.text
    return imke, begun.json()["id"], body


def test_slow_probe_is_flagged_wherever_it_is_picked(flagged: Any) -> None:
    imke, _, body = flagged
    told = imke.get(f"/api/instruments/{body['probe_id']}").json()
    assert told["calibrations"][0]["verdict"] == "fails"
    assert "The slope is 93.0 % of Nernst" in told["flag"]
    page = imke.get(f"/instruments/{body['probe_id']}").text
    assert "Flagged at the bench" in page
    assert "The slope is 93.0 % of Nernst" in page
    url = f"/bench/begin?lot={body['lot_code']}&recipe={body['recipe_id']}"
    assert "The slope is 93.0 % of Nernst" in imke.get(url).text
    # a sheet whose end point is seen offers no probe, and takes none
    seen = picks(imke)
    assert (
        "Probe E-3"
        not in imke.get(f"/bench/begin?lot={seen['lot_code']}&recipe={seen['recipe_id']}").text
    )
    odd = imke.post("/api/sheets", seen | {"probe_id": body["probe_id"]})
    assert (odd.status_code, odd.json()["field"]) == (422, "probe_id")


def test_slow_probe_and_sample_below_the_minimum_fail_at_hand_in(flagged: Any) -> None:
    imke, sheet, _ = flagged
    told = imke.get(f"/api/sheets/{sheet}").json()
    probe = next(one for one in told["rests_on"] if one["kind"] == "probe")
    assert "The slope is 93.0 % of Nernst" in probe["flag"]
    lines = [(0, "temperature", "20.6")]
    for replicate in (1, 2, 3):
        # 0.0900 g where the lot asks for 0.1 g at least
        lines += [
            (replicate, "container_and_standard", "20.0900"),
            (replicate, "container_less_standard", "20.0000"),
            (replicate, "burette_start", "0.00"), (replicate, "burette_end", "7.42"),
        ]  # fmt: skip
    entries = [
        {"id": str(uuid4()), "replicate": number, "slot": slot, "text": text}
        for number, slot, text in lines
    ]
    written = imke.post(f"/api/sheets/{sheet}/entries", {"entries": entries})
    assert written.status_code == 200, written.text
    findings = {
        one["name"]: one for one in imke.get(f"/api/sheets/{sheet}/hand-in").json()["findings"]
    }
    assert findings["probe"]["verdict"] == "fails"
    assert "93.0 % of Nernst (outside 95 to 102 %)" in findings["probe"]["says"]
    assert findings["sample mass"]["verdict"] == "fails"
    page = imke.get(f"/bench/{sheet}/hand-in").text
    for name in ("probe", "sample mass"):
        assert findings[name]["says"] in page.replace("&#39;", "'")
