"""Curves over the API: shown before they are kept, kept with their original, refused in words."""

import base64
import hashlib
from typing import Any
from uuid import uuid4

import pytest
from sqlalchemy import func, select

from server.lab.curve_entry import CURVE_METHODS, CURVE_SYSTEMS
from server.records.tables.stores import File
from server.web.guards import MOST_BODY, MOST_CURVE_BODY
from tests.procedures.test_curve_entries import khp_curve, pasted

CURVE = (4, "curve")


@pytest.fixture(scope="module")
def imke(shared_web: Any) -> Any:
    return shared_web.client("imke")


@pytest.fixture(scope="module")
def sheet(shared_web: Any) -> str:
    """A sheet whose fourth replicate waits for its curve."""
    return f"/api/sheets/{shared_web.demo.open_curve_sheet_id}"


def files(web: Any) -> int:
    found: int = web.transactions.read(
        lambda session: session.scalar(select(func.count()).select_from(File))
    )
    return found


def encoded(text: str) -> str:
    return base64.b64encode(text.encode()).decode()


def preview(hand: Any, sheet: str, *, status: int = 200, **given: Any) -> dict[str, Any]:
    answer = hand.post(f"{sheet}/curves/preview", {"replicate": 4, **given})
    assert answer.status_code == status, answer.text
    found: dict[str, Any] = answer.json()
    return found


def entry(curve: Any, **more: Any) -> dict[str, Any]:
    return {
        "id": str(uuid4()), "replicate": 4, "slot": "curve", "text": "", "curve": curve, **more,
    }  # fmt: skip


def row_of(sheet: dict[str, Any], replicate: int, slot: str) -> dict[str, Any]:
    for group in sheet["groups"]:
        for row in group["rows"]:
            if (row["replicate"], row["slot"]) == (replicate, slot):
                found: dict[str, Any] = row
                return found
    raise AssertionError(slot)


def test_preview_tells_columns_volumes_and_pictures_and_stores_nothing(
    shared_web: Any, imke: Any, sheet: str
) -> None:
    before, kept = imke.get(sheet).json(), files(shared_web)
    text = pasted(khp_curve(), header="Volume (mL);pH")
    shown = preview(imke, sheet, file_name="run4.csv", content_base64=encoded(text))
    assert shown["text"] == "run4.csv, 49 points, pH"
    assert shown["sha256"] == hashlib.sha256(text.encode()).hexdigest()
    assert [(one["name"], one["taken_as"]) for one in shown["columns"]] == [
        ("Volume (mL)", "volume, mL"),
        ("pH", "pH"),
    ]
    assert shown["first"][0] == ["0.00", khp_curve()[0][1]]
    assert any(one.startswith("Taken: volume in mL") for one in shown["says"])
    methods = {one["method"]: one for one in shown["curve"]["methods"]}
    assert set(methods) == set(CURVE_METHODS)
    assert abs(float(methods["first derivative"]["volume"]) - 20.0) < 0.1
    picture = shown["curve"]["pictures"]["whole"]
    assert picture.startswith("<svg")
    assert all(one in picture for one in ("model fit", "first derivative"))
    assert (imke.get(sheet).json(), files(shared_web)) == (before, kept)


@pytest.mark.parametrize(
    ("given", "field"),
    [
        ({}, "content_base64"),
        ({"pasted": 5}, "pasted"),
        ({"pasted": "1;2", "colour": "pink"}, "colour"),
        ({"pasted": "1;2", "leave_out": ["1"]}, "leave_out[0]"),
        ({"pasted": "1;2", "mapping": [0, 1]}, "mapping"),
        ({"pasted": "1;2", "replicate": "4"}, "replicate"),
        ({"pasted": "1;2", "replicate": 99}, "replicate"),
        ({"pasted": "1;2"}, "file"),
        ({"pasted": "a\u0000b"}, "pasted"),
    ],
)
def test_preview_that_cannot_be_names_the_field(
    imke: Any, sheet: str, given: dict[str, Any], field: str
) -> None:
    problem = preview(imke, sheet, status=422, **given)
    assert problem["field"] == field, problem
    assert problem["detail"]


def test_preview_of_a_bad_row_points_at_it_and_shows_the_table(imke: Any, sheet: str) -> None:
    text = pasted().replace("10.00;", "10.00;-.-")
    problem = preview(imke, sheet, status=422, pasted=text)
    assert problem["detail"].startswith("Row 22, column 2")
    assert (problem["shown"]["row"], problem["shown"]["column"]) == (22, 2)
    assert problem["shown"]["table"]["header"] == ["volume (mL)", "pH"]
    shown = preview(imke, sheet, pasted=text, leave_out=[22])
    assert shown["points"] == 48
    assert "Row 22" in shown["set_aside"][0]


def test_curve_door_takes_more_than_others_and_not_without_bound(imke: Any, sheet: str) -> None:
    spaces = " " * (MOST_BODY + 1000)
    assert "nothing in it" in preview(imke, sheet, status=422, pasted=spaces)["detail"]
    huge = preview(imke, sheet, status=413, pasted=" " * (MOST_CURVE_BODY + 10))
    assert "kB" in huge["detail"]
    answer = imke.post(f"{sheet}/abandon", {"reason": spaces})
    assert answer.status_code == 413


def test_curve_is_written_with_its_file_and_the_original_is_handed_out(
    web: Any,
) -> None:
    hand = web.client("imke")
    sheet = f"/api/sheets/{web.demo.open_curve_sheet_id}"
    text = pasted(khp_curve())
    shown = preview(hand, sheet, file_name="run4.csv", content_base64=encoded(text))
    one = entry(
        {"file_name": "run4.csv", "content_base64": encoded(text), "mapping": shown["mapping"]}
    )
    first = hand.post(f"{sheet}/entries", [one])
    assert first.status_code == 200, first.text
    again = hand.post(f"{sheet}/entries", [one])
    assert again.json()["written"][0]["repeated"] is True
    row = row_of(first.json()["sheet"], *CURVE)
    assert (row["value"]["text"], row["value"]["raw"]) == (shown["text"], None)
    original = hand.get(row["value"]["file_url"])
    assert original.content == text.encode()
    digest = base64.b64encode(hashlib.sha256(text.encode()).digest()).decode()
    assert original.headers["Repr-Digest"] == f"sha-256=:{digest}:"
    assert original.headers["Content-Disposition"].startswith("attachment")
    twice = preview(hand, sheet, replicate=4, file_name="x.csv", content_base64=encoded(text))
    assert twice["same_as"] is None  # its own curve is no other replicate's
    stands = row["value"]["id"]
    strike = entry({"pasted": pasted(khp_curve(20.1))}, strikes=stands, reason="wrong file")
    assert hand.post(f"{sheet}/entries", [strike]).status_code == 200
    told = row_of(hand.get(sheet).json(), *CURVE)
    assert [one["entry"]["text"] for one in told["struck"]] == [shown["text"]]
    assert told["struck"][0]["entry"]["file_url"] == row["value"]["file_url"]


def test_curve_that_cannot_be_read_writes_nothing_of_the_list(imke: Any, sheet: str) -> None:
    before = imke.get(sheet).json()
    remark = {"id": str(uuid4()), "replicate": 4, "slot": "remark", "text": "stirred"}
    answer = imke.post(f"{sheet}/entries", [remark, entry({"pasted": "1;2"})])
    assert answer.status_code == 422
    assert imke.get(sheet).json() == before


def test_recipe_form_offers_every_method_and_system_and_takes_a_curve(shared_web: Any) -> None:
    keeper = shared_web.client("jonas")
    page = keeper.get("/stores/recipes/new").text
    for word in (*CURVE_METHODS, *CURVE_SYSTEMS):
        assert f'<option value="{word}"' in page
    fields = {
        "name": "NaOH by a curve", "titrant_substance": "NaOH", "titrant_nominal": "0.1",
        "titrant_medium": "water", "standard": "KHP", "replicates": "3",
        "end_point_mode": "potentiometric", "end_point_method": "model fit",
        "end_point_system": "khp-naoh", "end_point_flask_volume_mL": "50,5",
        "interval_days": "14", "notice_days": "3", "version": "0",
    }  # fmt: skip
    written = keeper.form("/stores/recipes/new", **fields)
    assert written.status_code == 303, written.text
    page = keeper.get(written.headers["location"]).text
    assert "a curve for each replicate, taken by model fit" in page
    assert "50.5 mL" in page
    recipe = written.headers["location"].rpartition("/")[2]
    again = keeper.get(f"/stores/recipes/new?from={recipe}").text
    assert '<option value="khp-naoh" selected' in again
    odd = keeper.form("/stores/recipes/new", **fields | {"end_point_mode": "visual"})
    assert odd.status_code == 422
