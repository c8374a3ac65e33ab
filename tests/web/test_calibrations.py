"""Calibrations in the browser's forms and over the API: weighing by weighing, and from files."""

import base64
import hashlib
import math
import re
import time
from datetime import timedelta
from pathlib import Path
from typing import Any
from uuid import uuid4

import pytest

#: Own content in the published structure of DCC 3.3.0 (https://ptb.de/dcc/v3.3.0/dcc.xsd).
DCC = (Path(__file__).parents[1] / "reference" / "dcc" / "balance.xml").read_bytes()
PAPERS = {"done_on": "2026-05-04", "due_on": "2027-05-03", "due_basis": "12 months, own plan"}
AIR = {"temperature": "21.3", "pressure": "1003.1", "humidity": "46"}
#: Ten weighings of a 10 mL pipette in water of 20.0 to 20.4 °C, made up for this test.
WEIGHINGS = [
    ("31.4021", "41.3778", "20.1"), ("31.0177", "40.9951", "20.0"), ("30.8803", "40.8540", "20.2"),
    ("31.2214", "41.1969", "20.2"), ("31.1140", "41.0922", "20.3"), ("31.5093", "41.4824", "20.1"),
    ("31.3320", "41.3085", "20.4"), ("31.2871", "41.2619", "20.2"), ("30.9456", "40.9230", "20.3"),
    ("31.0505", "41.0251", "20.2"),
]  # fmt: skip


def v20(before: str, after: str, water_C: str) -> float:
    """V20 in mL of one weighing, from the published equations alone.

    Water: Tanaka et al., Metrologia 38 (2001) 301. Air: CIPM-2007, Metrologia 45 (2008) 149.
    Volume: ISO 4787 with γ = 9.9e-6 /K and weights of 8000 kg/m³.
    """
    t = float(water_C)
    water = 999.97495 * (1 - (t - 3.983035) ** 2 * (t + 301.797) / (522528.9 * (t + 69.34881)))
    ta, p, h = 21.3, 100310.0, 0.46
    T = ta + 273.15
    psv = math.exp(1.2378847e-5 * T * T - 1.9121316e-2 * T + 33.93711047 - 6.3431645e3 / T)
    x = h * (1.00062 + 3.14e-8 * p + 5.6e-7 * ta * ta) * psv / p
    Z = (
        1
        - p
        / T
        * (
            1.58123e-6
            - 2.9331e-8 * ta
            + 1.1043e-10 * ta**2
            + (5.707e-6 - 2.051e-8 * ta) * x
            + (1.9898e-4 - 2.376e-6 * ta) * x * x
        )
        + p * p / (T * T) * (1.83e-11 - 0.765e-8 * x * x)
    )
    air = 3.483740e-3 * p / (Z * T) * (1 - 0.3780 * x)
    net = float(after) - float(before)
    return net * 1000 / (water - air) * (1 - air / 8000) * (1 - 9.9e-6 * (t - 20))


@pytest.fixture
def keeper(web: Any) -> Any:
    return web.client("jonas")


def ids(hand: Any) -> dict[str, str]:
    return {one["name"]: one["id"] for one in hand.get("/api/instruments").json()["instruments"]}


def register(hand: Any, kind: str, name: str, **more: str) -> str:
    stated = {"kind": kind, "name": name, "maker": "Holm", "type": "t", "serial": "1"}
    answer = hand.post("/api/instruments", {**stated, "location": "Bench 1", **more})
    assert answer.status_code == 201, answer.text
    found: str = answer.json()["id"]
    return found


def pipette_form(count: int = 10, **more: str) -> dict[str, str]:
    typed = {
        "ware": "pipette", "nominal": "10", "grade": "A", "glass_expansion": "9.9e-6",
        "water": "degassed", "air_temperature": "21,3", "air_pressure": "1003.1",
        "air_humidity": "46", "rule": "simple acceptance", "rows": "10", **PAPERS,
    }  # fmt: skip
    for i, (before, after, water) in enumerate(WEIGHINGS[:count]):
        typed |= {f"w{i}_before": before, f"w{i}_after": after, f"w{i}_water": water}
    return typed | more


def test_ten_weighings_give_the_volumes_of_the_published_equations(keeper: Any) -> None:
    pipette = register(keeper, "pipette", "Pipette 1", capacity="10")
    wanted = [v20(*one) for one in WEIGHINGS]

    page = keeper.form(f"/instruments/{pipette}/runs/new", do="show", **pipette_form())
    assert page.status_code == 200
    shown = re.findall(r"<output[^>]*>([\d.]+)</output>", page.text)
    assert [float(one) for one in shown] == pytest.approx(wanted, rel=1e-6)
    assert keeper.get(f"/api/instruments/{pipette}").json()["calibrations"] == []

    answer = keeper.form(f"/instruments/{pipette}/runs/new", do="record", **pipette_form())
    assert answer.status_code == 303, answer.text
    told = keeper.get(f"/api/instruments/{pipette}/calibrations/1").json()
    assert told["run"]["volumes"] == pytest.approx(wanted, rel=1e-9)
    mean = sum(wanted) / 10
    s = math.sqrt(sum((one - mean) ** 2 for one in wanted) / 9)
    facts = {one["label"]: one["value"] for one in told["run"]["facts"]}
    assert facts["Mean at 20 °C"].startswith(f"{mean:.5f} mL")
    assert float(facts["Random error, s"].split()[0]) == pytest.approx(s, abs=5e-5)
    # ISO 648:2008, 10 mL class A: ± 0.02 mL
    assert abs(mean - 10) < 0.02
    checks = {one["name"]: one for one in told["run"]["checks"]}
    assert checks["systematic error"]["verdict"] == "holds"
    assert checks["systematic error"]["rule"] == "simple acceptance"
    assert "ISO 648:2008 class A, 10 mL" in checks["systematic error"]["basis"]

    # as if it were of class A with 2 mL less: the same weighings fail
    far = pipette_form(nominal="20")
    refused = keeper.form(f"/instruments/{pipette}/runs/new", do="record", **far)
    assert refused.status_code == 422
    assert "It fails: systematic error" in refused.text


def test_run_over_the_api_is_the_same_run(keeper: Any) -> None:
    pipette = register(keeper, "pipette", "Pipette 1", capacity="10")
    run = {
        "kind": "pipette", "nominal": "10", "class": "A", "water": "degassed",
        "glass_expansion": "9.9e-6", "air": AIR,
        "weighings": [dict(zip(("before", "after", "water"), one, strict=True))
                      for one in WEIGHINGS],
    }  # fmt: skip
    preview = keeper.post(f"/api/instruments/{pipette}/runs/preview", {"run": run}).json()
    assert [float(one) for one in preview["volumes"].values()] == pytest.approx(
        [v20(*one) for one in WEIGHINGS], rel=1e-6
    )
    assert preview["run"]["verdict"] == "look"  # no uncertainty was stated
    balance = ids(keeper)["Balance B-2"]
    body = {"run": run, "balance_id": balance, **PAPERS}
    made = keeper.post(f"/api/instruments/{pipette}/runs", body)
    assert made.status_code == 201, made.text
    told = keeper.get(f"/api/instruments/{pipette}/calibrations/1").json()
    assert told["run"]["used"][0]["name"] == "Balance B-2"
    wrong = keeper.post(
        f"/api/instruments/{pipette}/runs", body | {"run": run | {"weighings": [{"net": "1"}]}}
    )
    assert (wrong.status_code, wrong.json()["field"]) == (422, "weighings[0].before")


def test_run_keeps_all_that_was_typed_and_shows_volumes_as_they_come(keeper: Any) -> None:
    pipette = register(keeper, "pipette", "Pipette 1", capacity="10")
    url = f"/instruments/{pipette}/runs/new"
    typed = pipette_form(2, w5_before="30.1234", w7_left_out="drop <hung>", w0_left_out="")
    page = keeper.form(url, do="more", **typed)
    assert page.status_code == 200
    assert page.text.count('class="reading-row"') == 15
    for name, value in typed.items():
        if name != "rows":
            held = re.search(rf'name="{name}"[^>]*value="([^"]*)"', page.text)
            chosen = re.search(
                rf'name="{name}".*?<option value="{re.escape(value)}" selected',
                page.text,
                re.DOTALL,
            )
            shown = value.replace("<", "&lt;").replace(">", "&gt;")
            assert chosen or (held and held[1] == shown), name
    outputs = dict(re.findall(r'id="v(\d+)"[^>]*>([\d.]*)<', page.text))
    assert {key for key, value in outputs.items() if value} == {"0", "1"}
    assert "Not whole yet: 2 rows" in page.text
    refused = keeper.form(url, do="record", **typed)
    assert refused.status_code == 422
    assert 'value="30.1234"' in refused.text
    assert "Weighing 6, after is missing" in refused.text
    assert re.search(r'name="w5_after"[^>]*aria-invalid="true"', refused.text)


@pytest.mark.parametrize(
    ("change", "field", "says"),
    [
        ({"nominal": "x"}, "nominal", "not a decimal number"),
        ({"air_pressure": ""}, "air_pressure", "Air pressure is missing"),
        ({"glass_expansion": "x"}, "glass_expansion", "Cubic expansion: “x” is not"),
        ({"w3_after": "20"}, "w3_after", "Weighing 4: 20 g is not more than before"),
        ({"w9_water": "99"}, "w9_water", "Weighing 10, water"),
        ({"grade": "Q"}, "grade", "one of"),
        ({"due_on": ""}, "due_on", "a day"),
        ({"balance_id": "none"}, "balance_id", "no such balance"),
        ({"u_weighing": "-1"}, "u_weighing", "negative"),
        ({"w2_air_pressure": "100"}, "w2_air_pressure", "Weighing 3, air pressure"),
        ({"w2_minutes": "x"}, "w2_minutes", "Weighing 3, minutes"),
    ],
)
def test_odd_run_form_names_its_field_and_row(
    web: Any, change: dict[str, str], field: str, says: str
) -> None:
    keeper = web.client("jonas")
    pipette = register(keeper, "pipette", f"Pipette {uuid4()}", capacity="10")
    typed = pipette_form(air_each="yes", **change)
    answer = keeper.form(f"/instruments/{pipette}/runs/new", do="record", **typed)
    assert answer.status_code == 422
    assert says in answer.text
    assert re.search(rf'name="{field}"[^>]*aria-invalid="true"', answer.text), field


def test_air_read_at_a_weighing_goes_before_that_of_the_run(keeper: Any) -> None:
    pipette = register(keeper, "pipette", "Pipette 1", capacity="10")
    url = f"/instruments/{pipette}/runs/new"
    assert "w0_air_temperature" not in keeper.get(url).text
    page = keeper.form(url, air_each="yes", **pipette_form())
    shown = re.findall(r"<output[^>]*>([\d.]+)</output>", page.text)
    assert [float(one) for one in shown] == pytest.approx([v20(*one) for one in WEIGHINGS], 1e-6)

    own = {"w0_air_temperature": "21,3", "w0_air_pressure": "1003.1", "w0_air_humidity": "46"}
    run = {"air_temperature": "24", "air_pressure": "950", "air_humidity": "60"}
    page = keeper.form(url, air_each="yes", **pipette_form(**own, **run))
    moved = [float(one) for one in re.findall(r"<output[^>]*>([\d.]+)</output>", page.text)]
    assert moved[0] == float(shown[0])
    # air of 950 hPa and 24 °C is lighter by 0.08 kg/m³: 7 parts in 100 000 less buoyancy
    assert 5e-5 < 1 - moved[1] / float(shown[1]) < 9e-5
    answer = keeper.form(url, do="record", air_each="yes", **pipette_form(**own, **run))
    assert answer.status_code == 303


def test_run_form_without_its_token_is_refused_and_nothing_is_recorded(keeper: Any) -> None:
    pipette = register(keeper, "pipette", "Pipette 1", capacity="10")
    for do in ("show", "record"):
        sent = {"form_token": "x", "key": str(uuid4()), "do": do, **pipette_form()}
        answer = keeper.client.post(f"/instruments/{pipette}/runs/new", data=sent)
        assert answer.status_code == 403
    assert keeper.get(f"/api/instruments/{pipette}").json()["calibrations"] == []


def test_run_sent_twice_is_recorded_once(keeper: Any) -> None:
    pipette = register(keeper, "pipette", "Pipette 1", capacity="10")
    key = str(uuid4())
    for _ in range(2):
        form = pipette_form(do="record")
        answer = keeper.form(f"/instruments/{pipette}/runs/new", key=key, **form)
        assert answer.status_code == 303
    assert len(keeper.get(f"/api/instruments/{pipette}").json()["calibrations"]) == 1


def hand_over(hand: Any, balance: str, content: bytes, name: str = "b2.xml", **more: str) -> Any:
    sent = {"form_token": hand.token, "key": str(uuid4()), **more}
    files = {"original": (name, content, "application/octet-stream")}
    return hand.client.post(f"/instruments/{balance}/imports/new", data=sent, files=files)


def test_certificate_from_outside_becomes_a_balance_calibration_once_it_is_confirmed(
    keeper: Any,
) -> None:
    balance = ids(keeper)["Balance B-2"]
    taken = hand_over(keeper, balance, DCC, "../scan of <B-2>.xml")
    assert taken.status_code == 303, taken.text
    url = taken.headers["location"].partition("?")[0]
    page = keeper.get(url).text
    for words in ("WL-2026-0815", "Weights &amp; Levels", "-0.00086", "house_mood", "Sealed.",
                  hashlib.sha256(DCC).hexdigest(), "serial number 00417"):  # fmt: skip
        assert words in page, words
    # nothing counts before it is confirmed
    assert len(keeper.get(f"/api/instruments/{balance}").json()["calibrations"]) == 1

    held = dict(re.findall(r'<input id="(\w+)" name="\w+" type="\w+" value="([^"]*)"', page))
    area = re.search(r'<textarea id="error_table"[^>]*>([^<]*)<', page)
    assert area is not None
    stated = {
        "certificate_number": held["certificate_number"], "issuer": "Weights & Levels",
        "done_on": held["done_on"], "due_on": held["due_on"], "due_basis": held["due_basis"],
        "error_u_unit": "g", "error_u_statement": "u", "error_u_bound": held["error_u_bound"],
        "error_table": area[1], "linearity_unit": "g", "linearity_statement": "half_width",
        "linearity_bound": "0.0002", "linearity_shape": "rectangular",
    }  # fmt: skip
    other = keeper.form(url, **stated)
    assert other.status_code == 422
    assert "Tick that it is" in other.text
    assert keeper.form(url, **stated, same_instrument="yes").status_code == 303

    newest = keeper.get(f"/api/instruments/{balance}").json()["calibrations"][0]
    assert (newest["version"], newest["certificate"]) == (2, "WL-2026-0815")
    assert newest["table"]["rows"] == [
        ["0", "0"], ["50.0002", "-0.00018"], ["100.0004", "-0.00037"], ["200.0008", "-0.00086"],
    ]  # fmt: skip
    assert newest["file"]["sha256"] == hashlib.sha256(DCC).hexdigest()
    original = keeper.get(newest["file"]["url"])
    assert original.content == DCC
    assert original.headers["content-disposition"].startswith("attachment")
    assert original.headers["x-content-type-options"] == "nosniff"
    assert "sandbox" in original.headers["content-security-policy"] or (
        "default-src 'none'" in original.headers["content-security-policy"]
    )
    shown = keeper.get(f"/instruments/{balance}").text
    assert "-0.00086" in shown
    assert "Correction, added to the reading" in shown


def test_table_over_the_api_is_proposed_and_confirmed(keeper: Any) -> None:
    balance = ids(keeper)["Balance B-2"]
    content = b"load, g;error, mg;U, mg;k\n50,0;0,20;0,10;2\n100,0;-0,40;0,16;2\n"
    body = {"file_name": "B-2.csv", "content_base64": base64.b64encode(content).decode()}
    made = keeper.post(f"/api/instruments/{balance}/imports", body)
    assert made.status_code == 201, made.text
    assert made.json()["sha256"] == hashlib.sha256(content).hexdigest()
    told = keeper.get(made.json()["url"]).json()
    assert told["rows"] == [["50.0", "-0.00020", "0.00005"], ["100.0", "0.00040", "0.00008"]]
    turned = keeper.get(made.json()["url"] + "?means=correction").json()
    assert turned["rows"][0][1] == "0.00020"
    odd = keeper.get(made.json()["url"] + "?means=guess").json()
    assert "means is correction, error" in odd["problem"]
    calibration = {
        "certificate_number": "K-7", "issuer": "house", **PAPERS, "file_id": made.json()["id"],
        "document": {
            "linearity": {"unit": "g", "half_width": "0.0002", "shape": "rectangular"},
            "error_table": [["0", "0"], ["50.0", "-0.00020"], ["100.0", "0.00040"]],
        },
    }  # fmt: skip
    assert keeper.post(f"/api/instruments/{balance}/calibrations", calibration).status_code == 201
    newest = keeper.get(f"/api/instruments/{balance}").json()["calibrations"][0]
    assert newest["file"]["name"] == "B-2.csv"


def test_certificate_of_a_pipette_fills_its_volume_and_that_of_a_balance_does_not(
    keeper: Any,
) -> None:
    pipette = register(keeper, "pipette", "Pipette 1", capacity="10", serial="00417")
    lists = re.search(rb"<dcc:list>.*</dcc:list>", DCC, re.DOTALL)
    assert lists is not None
    one = b"""<dcc:list><dcc:quantity refType="basic_measuredValue">
<dcc:name><dcc:content>Delivered</dcc:content></dcc:name><si:real><si:value>10.0030</si:value>
<si:unit>\\milli\\litre</si:unit><si:measurementUncertaintyUnivariate><si:expandedMU>
<si:valueExpandedMU>0.0040</si:valueExpandedMU><si:coverageFactor>2</si:coverageFactor>
<si:coverageProbability>0.95</si:coverageProbability></si:expandedMU>
</si:measurementUncertaintyUnivariate></si:real></dcc:quantity></dcc:list>"""
    taken = hand_over(keeper, pipette, DCC.replace(lists[0], one))
    assert taken.status_code == 303, taken.text
    page = keeper.get(taken.headers["location"]).text
    held = dict(re.findall(r'<input id="(\w+)" name="\w+" type="\w+" value="([^"]*)"', page))
    assert (held["delivery_value"], held["delivery_bound"], held["delivery_k"]) == (
        "10.0030", "0.0040", "2",
    )  # fmt: skip
    assert "look whether the certificate says so" in page

    other = hand_over(keeper, pipette, DCC)
    told = keeper.get(f"/api{other.headers['location'].partition('?')[0]}").json()
    assert told["chosen"] is None
    assert "No list of this certificate is read by itself" in told["says"][0]


def entity_bomb() -> bytes:
    lines = "<!ENTITY e0 'lol'>"
    lines += "".join(f"<!ENTITY e{i} '{f'&e{i - 1};' * 10}'>" for i in range(1, 12))
    return f'<?xml version="1.0"?><!DOCTYPE x [{lines}]><x>&e11;</x>'.encode()


HOSTILE = {
    "entity bomb": (entity_bomb(), 422, "DOCTYPE"),
    "external entity": (
        b'<?xml version="1.0"?><!DOCTYPE x [<!ENTITY a SYSTEM "file:///etc/passwd">]><x>&a;</x>',
        422, "DOCTYPE",
    ),
    "3 MB": (DCC + b"<!-- " + b"x" * 3_000_000 + b" -->", 413, "more than"),
    "script": (b"<html><script>alert(1)</script></html>", 422, "no Digital Calibration"),
    "program": (b"\x7fELF\x02\x01\x01" + b"\0" * 500, 422, ""),
}  # fmt: skip


@pytest.mark.parametrize("name", HOSTILE)
def test_hostile_file_is_refused_in_words_within_two_seconds(keeper: Any, name: str) -> None:
    content, status, says = HOSTILE[name]
    balance = ids(keeper)["Balance B-2"]
    begun = time.perf_counter()
    page = hand_over(keeper, balance, content)
    body = {"file_name": "x.xml", "content_base64": base64.b64encode(content).decode()}
    api = keeper.post(f"/api/instruments/{balance}/imports", body)
    assert time.perf_counter() - begun < 4  # two requests
    assert (page.status_code, api.status_code) == (status, status)
    assert says in page.text
    assert says in api.json()["detail"]
    assert len(keeper.get(f"/api/instruments/{balance}").json()["calibrations"]) == 1


def test_class_identity_limits_check_and_strike_have_forms(web: Any) -> None:
    keeper, analyst = web.client("jonas"), web.client("imke")
    flask = register(keeper, "flask", "Flask 1", capacity="100")
    stated = {"nominal": "100", "grade": "A", "shape": "triangular", **PAPERS}
    assert keeper.form(f"/instruments/{flask}/class/new", **stated).status_code == 303
    page = keeper.get(f"/instruments/{flask}").text
    assert "tolerance of ISO 1042:1998 class A, 100 mL, no gravimetric run" in page
    described = {"location": "Bench 9", "seen_location": "Bench 1", "reason": "moved"}
    assert keeper.form(f"/instruments/{flask}/identity", **described).status_code == 303
    assert "Bench 9" in keeper.get(f"/instruments/{flask}").text
    late = keeper.form(f"/instruments/{flask}/identity", **described)
    assert late.status_code == 409
    assert "moved" in late.text

    balance = ids(keeper)["Balance B-2"]
    limits = {"name": "20 g, W-1", "first": "20,0001 20.0000 20.0001 20.0002 20.0001",
              "step": "0.0001"}  # fmt: skip
    assert keeper.form(f"/instruments/{balance}/limits", **limits).status_code == 303
    charts = {one["name"]: one["id"] for one in keeper.get(f"/api/instruments/{balance}").json()[
        "charts"]}  # fmt: skip
    assert set(charts) == {"100 g, W-3", "20 g, W-1"}
    web.clock.at += timedelta(minutes=5)
    check = {"chart": charts["20 g, W-1"], "reading": "20,0009"}
    assert analyst.form(f"/instruments/{balance}/checks", **check).status_code == 303
    web.clock.at += timedelta(minutes=5)
    page = analyst.get(f"/instruments/{balance}").text
    assert "Flagged at the bench" in page
    lot = analyst.get("/api/sheets").json()["lots"][0]["id"]
    assert "beyond the action limit" in analyst.get(f"/bench/begin?lot={lot}").text
    line = analyst.get(f"/api/instruments/{balance}").json()["lines"][0]
    struck = {"line_id": line["id"], "strike_reason": "wrong weight on the pan"}
    assert analyst.form(f"/instruments/{balance}/strike", **struck).status_code == 303
    page = analyst.get(f"/instruments/{balance}").text
    assert "Flagged at the bench" not in page
    assert "wrong weight on the pan" in page


def test_drops_of_a_burette_are_weighed_in_a_form(web: Any) -> None:
    analyst = web.client("imke")
    burette = ids(analyst)["Piston burette P-25"]
    url = f"/instruments/{burette}/drops/new"
    typed = {
        "drops": "20", "glass_expansion": "9.9e-6", "water": "degassed", "air_temperature": "21.3",
        "air_pressure": "1003.1", "air_humidity": "46", "balance_id": ids(analyst)["Balance B-2"],
        "w0_before": "20.0000", "w0_after": "20.9971", "w0_water": "20.0",
        "w2_before": "21.0000", "w2_after": "20.9000", "w2_water": "20.0",
    }  # fmt: skip
    refused = analyst.form(url, **typed)
    assert refused.status_code == 422
    assert "Weighing 3: 20.9000 g is not more than before" in refused.text
    assert 'value="20.9971"' in refused.text
    assert analyst.form(url, **typed | {"w2_after": "21.9973"}).status_code == 303
    page = analyst.get(f"/instruments/{burette}").text
    said = re.search(r"one drop ([\d.]+) mL, u = ([\d.]+) mL, 2 weighings of 20 drops", page)
    assert said is not None
    assert float(said[1]) == pytest.approx(
        (v20("20.0000", "20.9971", "20.0") + v20("21.0000", "21.9973", "20.0")) / 40, rel=1e-4
    )
