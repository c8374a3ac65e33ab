"""End-point methods compared, as a page and over the API."""

from xml.etree import ElementTree as ET

import pytest

from server.records.queries.load_sheet import load_sheet_facts


@pytest.fixture
def code(shared_web):
    sheet = shared_web.demo.curve_sheet_id
    return shared_web.transactions.read(lambda s: load_sheet_facts(s, sheet)).lot.code


@pytest.fixture
def countersigner(shared_web):
    return shared_web.client("cleo")


def test_page_and_api_tell_the_same(countersigner, code) -> None:
    page = countersigner.get(f"/lots/{code}/methods").text
    told = countersigner.get(f"/api/lots/{code}/methods").json()["comparison"]
    for sentence in ("precision", "trueness", "matters", "proposal"):
        assert told[sentence].replace("'", "&#39;") in page
    for row in told["rows"]:
        assert row["mean"] in page


def test_picture_on_the_page_is_an_image_with_words(countersigner, code) -> None:
    told = countersigner.get(f"/api/lots/{code}/methods").json()["comparison"]
    root = ET.fromstring(told["chart"])
    assert root.get("role") == "img"
    for row in told["rows"]:
        assert f"{row['method']} ({row['shape']}): {row['n']} values" in root.get("aria-label")


def test_odd_reference_is_marked_on_the_page_and_kept(countersigner, code) -> None:
    answer = countersigner.get(f"/lots/{code}/methods?reference=about+0.1&reference_U=0.0001")
    assert answer.status_code == 422
    assert 'value="about 0.1"' in answer.text
    assert 'value="0.0001"' in answer.text
    assert 'id="reference-wrong"' in answer.text


def test_odd_reference_over_the_api_names_the_field(countersigner, code) -> None:
    answer = countersigner.get(f"/api/lots/{code}/methods?reference=0.1&reference_U=little")
    assert answer.status_code == 422
    assert answer.json()["field"] == "reference_U"


def test_sheet_of_no_such_number_is_not_found(countersigner, code) -> None:
    for room in ("", "/api"):
        answer = countersigner.get(f"{room}/lots/{code}/methods?sheet=S-1")
        assert answer.status_code == 404
        assert "S-1" in answer.text


def test_countersign_page_shows_the_comparison_in_its_second_band(
    shared_web, countersigner
) -> None:
    page = countersigner.get(f"/countersign/{shared_web.demo.curve_sheet_id}").text
    second = page.partition('id="why"')[2].partition('id="written"')[0]
    assert "End-point methods compared" in second
    assert "scatters least" in second
    assert 'class="chart strips"' in second
