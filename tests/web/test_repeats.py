"""R087, R088: one act however often it is sent."""

from concurrent.futures import ThreadPoolExecutor
from typing import Any
from uuid import uuid4

import sqlalchemy as sa

LOT = {"titrant": "NaOH", "nominal": "0.1", "name": "Lye of the double tap"}


def _count(web: Any, table: str, where: str = "1 = 1") -> int:
    with web.transactions.database.reader.connect() as connection:
        found: int = connection.execute(
            sa.text(f"SELECT count(*) FROM {table} WHERE {where}")
        ).scalar_one()
    return found


def test_form_sent_twice_makes_one_lot_and_leads_to_it_twice(web: Any) -> None:
    imke, before = web.client("imke"), _count(web, "lot")
    key = str(uuid4())

    first, second = (imke.form("/lots/new", key=key, **LOT) for _ in range(2))

    assert first.status_code == second.status_code == 303
    assert first.headers["location"] == second.headers["location"]
    assert _count(web, "lot") == before + 1


def test_form_sent_with_a_used_key_and_other_content_is_refused(web: Any) -> None:
    imke, key = web.client("imke"), str(uuid4())
    assert imke.form("/lots/new", key=key, **LOT).status_code == 303

    answer = imke.form("/lots/new", key=key, **{**LOT, "name": "Another lye"})

    assert answer.status_code == 422
    assert "came before" in answer.text or "sent before" in answer.text


def test_form_without_its_key_is_refused_and_shown_again(web: Any) -> None:
    imke = web.client("imke")

    answer = imke.client.post("/lots/new", data={"form_token": imke.token, **LOT})

    assert answer.status_code == 400
    assert LOT["name"] in answer.text


def test_api_write_with_the_same_key_is_done_once(web: Any) -> None:
    imke, before = web.client("imke"), _count(web, "lot")
    headers = {"Idempotency-Key": str(uuid4())}

    answers = [imke.post("/api/lots", LOT, **headers) for _ in range(3)]

    assert {one.status_code for one in answers} == {201}
    assert len({one.json()["code"] for one in answers}) == 1
    assert _count(web, "lot") == before + 1


def test_two_hundred_taps_at_once_make_one_lot_and_two_hundred_equal_replies(web: Any) -> None:
    imke, before = web.client("imke"), _count(web, "lot")
    headers = {"Idempotency-Key": str(uuid4())}

    with ThreadPoolExecutor(16) as pool:
        answers = list(pool.map(lambda _: imke.post("/api/lots", LOT, **headers), range(200)))

    assert {one.status_code for one in answers} == {201}
    assert len({one.text for one in answers}) == 1
    assert _count(web, "lot") == before + 1


def test_one_persons_key_is_not_anothers(web: Any) -> None:
    imke, bashir = web.client("imke"), web.client("bashir")
    headers = {"Idempotency-Key": "the same key"}
    first = imke.post("/api/lots", {**LOT, "name": "One"}, **headers)

    second = bashir.post("/api/lots", {**LOT, "name": "Two"}, **headers)

    assert first.status_code == second.status_code == 201
    assert first.json()["code"] != second.json()["code"]


def test_entry_sent_again_is_written_once_and_answered_as_repeated(web: Any) -> None:
    bashir = web.client("bashir")
    sheet = web.demo.open_sheet_id
    entry = {"id": str(uuid4()), "replicate": 0, "slot": "remark", "text": "window open"}
    row = next(
        (
            row
            for group in bashir.get(f"/api/sheets/{sheet}").json()["groups"]
            for row in group["rows"]
            if row["value"] is None and row["kind"] == "number" and row["unit"] == "mL"
        ),
        None,
    )
    assert row is not None
    entry = {
        "id": str(uuid4()),
        "replicate": row["replicate"],
        "slot": row["slot"],
        "segment": row["segment"],
        "text": "0.00" if row["slot"].endswith("start") else "20.90",
    }
    door = f"/api/sheets/{sheet}/entries"

    first, second = bashir.post(door, [entry]), bashir.post(door, {"entries": [entry]})

    assert first.status_code == second.status_code == 200, (first.text, second.text)
    assert first.json()["written"][0]["repeated"] is False
    assert second.json()["written"][0] == {**first.json()["written"][0], "repeated": True}
    assert _count(web, "entry", f"id = '{entry['id']}'") == 1
    other = bashir.post(door, [{**entry, "text": "0.01"}])
    assert other.status_code == 422
    assert other.json()["field"] == "id"


def test_countersign_sent_twice_issues_one_certificate(web: Any) -> None:
    cleo = web.client("cleo")
    sheet = web.demo.waiting_sheet_id
    page = cleo.get(f"/api/sheets/{sheet}/countersign").json()
    body = {
        "revision": page["revision"],
        "accepted": page["to_accept"],
        "trail_seen": page["trail_last"],
        "name": "cleo",
        "password": cleo.password,
    }
    headers, before = {"Idempotency-Key": str(uuid4())}, _count(web, "certificate")

    first, second = (
        cleo.post(f"/api/sheets/{sheet}/countersign", body, **headers) for _ in range(2)
    )

    assert first.status_code == second.status_code == 200, first.text
    assert first.json() == second.json()
    assert _count(web, "certificate") == before + 1
