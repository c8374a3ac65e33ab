"""Bad input over HTTP: refused with a sentence that names the field; nothing typed is lost."""

import json
from typing import Any
from uuid import uuid4

import pytest
import sqlalchemy as sa

from server.web.guards import MOST_BODY


def _entry(**more: Any) -> dict[str, Any]:
    return {"id": str(uuid4()), "replicate": 4, "slot": "burette_start", "text": "0.00", **more}


@pytest.fixture(scope="module")
def bashir(shared_web: Any) -> Any:
    return shared_web.client("bashir")


@pytest.fixture(scope="module")
def door(shared_web: Any) -> str:
    return f"/api/sheets/{shared_web.demo.open_sheet_id}/entries"


def _problem(answer: Any, status: int) -> dict[str, Any]:
    assert answer.status_code == status, answer.text
    assert answer.headers["content-type"] == "application/problem+json"
    problem: dict[str, Any] = answer.json()
    assert problem["status"] == status
    assert problem["title"]
    assert problem["detail"].endswith((".", "?"))
    assert problem["type"]
    return problem


@pytest.mark.parametrize(
    ("body", "status", "field"),
    [
        ([_entry(colour="pink")], 422, "entries[0].colour"),
        ([_entry(text=18.6)], 422, "entries[0].text"),
        ([_entry(replicate="4")], 422, "entries[0].replicate"),
        ([{"replicate": 0, "slot": "x", "text": "1"}], 400, "id"),
        ([_entry(id="not a uuid")], 422, "id"),
        ({"entries": [], "more": 1}, 422, "more"),
        ({}, 422, "entries"),
        ([], 422, "entries"),
        ([_entry(text="1\u00002")], 422, "entries[0].text"),
        (None, 422, None),
    ],
    ids=[
        "unknown key", "number for text", "text for number", "no uuid", "odd uuid",
        "unknown key beside", "no entries", "empty list", "nul", "null",
    ],
)  # fmt: skip
def test_odd_entries_are_refused_naming_the_field(
    bashir: Any, door: str, body: Any, status: int, field: str | None
) -> None:
    headers = {"X-Titrant-Ledger": "bench", "Content-Type": "application/json"}

    answer = bashir.client.post(door, content=json.dumps(body), headers=headers)

    problem = _problem(answer, status)
    assert problem.get("field") == field


@pytest.mark.parametrize(
    ("slot", "text", "says"),
    [
        ("container_and_standard", "-0.5000", None),
        ("burette_end", "20.123", None),
        ("burette_end", "2e1", None),
        ("burette_end", "1 8.64", None),
        ("burette_end", "18.6.4", None),
        ("burette_end", "26.00", None),
    ],
    ids=["negative mass", "too many decimals", "exponent", "space", "two points", "past the table"],
)
def test_reading_that_cannot_be_is_refused_and_the_sheet_stays(
    bashir: Any, door: str, slot: str, text: str, says: str | None
) -> None:
    sheet = door.removesuffix("/entries")
    before = bashir.get(sheet).json()["revision"]
    if slot == "container_and_standard" and "mass" in str(bashir.get(sheet).json()["groups"]):
        slot = "mass"

    answer = bashir.post(door, [_entry(replicate=3, slot=slot, text=text)])

    assert answer.status_code in {409, 422}, answer.text
    assert _problem(answer, answer.status_code)["field"]
    assert bashir.get(sheet).json()["revision"] == before


def test_unit_of_another_kind_is_refused(bashir: Any, door: str) -> None:
    answer = bashir.post(door, [_entry(unit="g")])

    problem = _problem(answer, 422)
    assert "mL" in problem["detail"]


@pytest.mark.parametrize(
    ("content", "kind", "status"),
    [
        (b"{not json", "application/json", 400),
        (b"\xff\xfe", "application/json", 400),
        (b'{"titrant": "NaOH"}', "text/plain", 415),
        (b"titrant=NaOH", "application/x-www-form-urlencoded", 415),
        (b"[" * 5000, "application/json", 400),
        (b'{"titrant":"\\ud800","nominal":"0.1"}', "application/json", 400),
    ],
    ids=["no json", "no utf-8", "text", "form", "deep", "half a character"],
)
def test_body_that_is_no_json_is_refused(
    bashir: Any, content: bytes, kind: str, status: int
) -> None:
    headers = {"X-Form-Token": bashir.token, "Content-Type": kind}

    _problem(bashir.client.post("/api/lots", content=content, headers=headers), status)


def test_body_that_is_too_large_is_refused_by_its_length_and_by_its_bytes(bashir: Any) -> None:
    headers = {"X-Form-Token": bashir.token, "Content-Type": "application/json"}
    large = b" " * (MOST_BODY + 1)

    _problem(bashir.client.post("/api/lots", content=large, headers=headers), 413)

    def parts() -> Any:
        for _ in range(MOST_BODY // 65536 + 2):
            yield b" " * 65536

    _problem(bashir.client.post("/api/lots", content=parts(), headers=headers), 413)
    form = bashir.client.post("/lots/new", data={"name": "x" * MOST_BODY})
    assert form.status_code == 413


def test_form_of_another_kind_or_encoding_is_refused(bashir: Any) -> None:
    # a form with files may come as multipart; this one holds nothing of the sort
    kinds = {"multipart/form-data; boundary=x": 400, "application/json": 415, "text/plain": 415}
    for kind, status in kinds.items():
        headers = {"Content-Type": kind}
        assert bashir.client.post("/lots/new", content=b"{}", headers=headers).status_code == status
    headers = {"Content-Type": "application/x-www-form-urlencoded"}
    for content in (b"name=%ff", b"name=\xff", b"name=%00"):
        assert bashir.client.post("/lots/new", content=content, headers=headers).status_code == 400


@pytest.mark.parametrize("address", ["/b/%00", "/?words=%00", "/api/bottles/%00", "/bench/%00"])
def test_address_with_a_character_that_no_text_has_is_refused(bashir: Any, address: str) -> None:
    assert bashir.get(address).status_code == 400


def test_refused_form_keeps_every_text_that_was_typed(bashir: Any) -> None:
    typed = {
        "name": "Lye <b>bold</b> & more",
        "titrant": "NaOH",
        "nominal": "-0,1",
        "medium": "water",
        "prepared_on": "2026-05-04",
        "preparation": "4.0 g pellets\n1 L of boiled-out water",
    }

    answer = bashir.form("/lots/new", **typed)

    assert answer.status_code == 422
    assert 'value="Lye &lt;b&gt;bold&lt;/b&gt; &amp; more"' in answer.text
    assert "<b>bold</b>" not in answer.text
    assert 'value="-0,1"' in answer.text
    assert "4.0 g pellets\n1 L of boiled-out water" in answer.text
    assert 'aria-invalid="true"' in answer.text


def test_markup_in_a_name_is_only_characters(web: Any) -> None:
    """A name is kept as typed and drawn as text, on every page that shows it."""
    name = "<script>alert(\"x\")</script> & 'co'"
    jonas, imke = web.client("jonas"), web.client("imke")
    form = {
        "kind": "balance", "name": name, "maker": name, "type": "t", "serial": "s",
        "location": name, "resolution": "0,0001",
    }  # fmt: skip
    made = jonas.form("/instruments/new", **form)
    assert made.status_code == 303, made.text
    lot = imke.post("/api/lots", {"titrant": "NaOH", "nominal": "0.1", "name": name})

    for address in (
        made.headers["location"], "/instruments", "/trail", "/bench",
        f"/lots/{lot.json()['code']}", f"/bench/begin?lot={lot.json()['code']}",
    ):  # fmt: skip
        page = imke.get(address)
        assert page.status_code == 200, address
        assert "<script>alert" not in page.text, address
        assert "&lt;script&gt;alert" in page.text, address
    listed = jonas.get("/api/instruments").json()["instruments"]
    assert name in {one["name"] for one in listed}


def test_lapsed_instrument_cannot_begin_a_sheet_and_the_form_says_why(web: Any) -> None:
    """R005: the refusal names the instrument; a keeper's reason lets it."""
    imke, jonas = web.client("imke"), web.client("jonas")
    tools = jonas.get("/api/instruments").json()["instruments"]
    old = next(one for one in tools if one["state"] == "lapsed")
    form = _begin_form(web, imke, burette_id=old["id"])

    refused = imke.form("/bench", **form)
    by_keeper = jonas.form("/bench", **form, override_reason="checked with water today")

    assert refused.status_code == 422
    assert old["name"] in refused.text
    assert by_keeper.status_code == 303, by_keeper.text
    page = imke.get(by_keeper.headers["location"])
    assert "checked with water today" in page.text


def _begin_form(web: Any, hand: Any, **more: str) -> dict[str, str]:
    stores, tools = (hand.get(f"/api/{name}").json() for name in ("stores", "instruments"))
    lot = hand.post("/api/lots", {"titrant": "NaOH", "nominal": "0.1"}).json()["code"]
    usable = {one["kind"]: one["id"] for one in tools["instruments"] if one["state"] != "lapsed"}
    standard = next(one for one in stores["standard_lots"] if "KHP" in str(one))
    recipe = next(one for one in stores["recipes"] if one["titrant"].startswith("NaOH"))
    return {
        "lot_code": lot,
        "recipe_id": recipe["id"],
        "standard_lot_id": standard["id"],
        "balance_id": usable["balance"],
        "burette_id": usable["burette"],
        "thermometer_id": usable["thermometer"],
        "room_id": usable["room monitor"],
        **more,
    }


def test_two_people_saving_at_once_are_both_shown(web: Any) -> None:
    """409: what stands and what was sent; the first entry stays."""
    imke, bashir = web.client("imke"), web.client("bashir")
    begun = imke.form("/bench", **_begin_form(web, imke))
    assert begun.status_code == 303, begun.text
    door = f"/api/sheets/{begun.headers['location'].removeprefix('/bench/')}/entries"
    slot = {"replicate": 0, "slot": "temperature"}
    first = imke.post(door, [{"id": str(uuid4()), "text": "21.5", **slot}])
    assert first.status_code == 200, first.text

    second = bashir.post(door, [{"id": str(uuid4()), "text": "21.9", **slot}])

    problem = _problem(second, 409)
    assert problem["shown"]["standing"]["text"] == "21.5"
    assert problem["shown"]["yours"]["text"] == "21.9"


def test_settings_saved_by_two_stewards_show_what_stands_and_keep_what_was_typed(web: Any) -> None:
    steward = web.client("marisol")
    form = {"name": "Tarnbeck Laboratory", "address": "4 Filter Lane", "zone": "Europe/Zurich"}
    assert steward.form("/laboratory", revision="1", shelf_open="yes", **form).status_code == 303

    late = steward.form("/laboratory", revision="1", **{**form, "name": "Tarnbeck, upper lab"})

    assert late.status_code == 409
    assert 'value="Tarnbeck, upper lab"' in late.text
    assert "What stands now" in late.text
    assert "Tarnbeck Laboratory" in late.text
    assert 'name="revision" value="2"' in late.text


def test_settings_that_the_form_does_not_show_stay_when_it_is_saved(web: Any) -> None:
    steward = web.client("marisol")
    settings = {"name": "Lab", "address": "", "zone": "Europe/Zurich", "shelf_open": True}
    limits = {"limits": {"spread_percent": "0.15"}, "idle_minutes": 45}
    assert steward.post("/api/laboratory", {**settings, **limits, "revision": 1}).status_code == 200

    form = {"name": "Lab", "address": "", "zone": "Europe/Zurich", "revision": "2"}
    assert steward.form("/laboratory", **form).status_code == 303

    with web.transactions.database.reader.connect() as connection:
        kept = connection.execute(sa.text("SELECT settings FROM laboratory")).scalar_one()
    assert '"spread_percent":"0.15"' in kept
    assert '"idle_minutes":45' in kept
    assert '"shelf_open":false' in kept


def test_signed_out_write_is_refused_and_what_was_typed_is_listed(shared_web: Any) -> None:
    visitor = shared_web.visitor()
    typed = {"reason": "cloudy since this morning", "kind": "bottle", "password": "never shown"}

    answer = visitor.post("/hold", data=typed)

    assert answer.status_code == 401
    assert "cloudy since this morning" in answer.text
    assert "never shown" not in answer.text


def test_refused_reason_of_a_small_form_is_listed_to_be_copied(web: Any) -> None:
    imke = web.client("imke")
    held = web.demo.bottles[3]
    assert imke.form("/hold", kind="bottle", thing=held, reason="first").status_code in {303, 403}

    again = imke.form("/hold", kind="bottle", thing=held, reason="it foams when shaken")

    assert again.status_code == 403
    assert "it foams when shaken" in again.text


def test_database_that_is_full_is_reported_and_nothing_is_half_saved(web: Any) -> None:
    imke, steward = web.client("imke"), web.client("marisol")
    last = steward.get("/api/trail").json()["lines"][0]["seq"]
    steps = "\n".join(f"step {n} of a long preparation" for n in range(300))
    lot = {"titrant": "NaOH", "nominal": "0.1", "preparation": steps}

    def let_grow(pages: int) -> None:
        """Let the file grow to so many pages; 1 stands for not at all."""
        web.transactions.write(
            lambda session: session.connection().exec_driver_sql(f"PRAGMA max_page_count = {pages}")
        )

    let_grow(1)
    by_form = imke.form("/lots/new", **lot, name="Lye with no room")
    by_api = imke.post("/api/lots", {**lot, "name": "Another with no room"})
    let_grow(1_000_000)

    assert by_form.status_code == 503
    assert "Lye with no room" in by_form.text
    assert "nothing of it was saved" in by_form.text
    assert _problem(by_api, 503)["detail"].startswith("The database did not take this")
    with web.transactions.database.reader.connect() as connection:
        count = connection.exec_driver_sql(
            "SELECT count(*) FROM lot WHERE name LIKE '%no room'"
        ).scalar_one()
    assert count == 0
    assert steward.get("/api/trail").json()["lines"][0]["seq"] == last
    assert imke.form("/lots/new", **lot, name="Lye with room").status_code == 303
