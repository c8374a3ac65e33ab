"""A curve as its page tells it: every method, which to believe, who chose, every point."""

import json
import re
from dataclasses import replace

import pytest

from server.lab.refusal import NotFound, NotSignedIn
from server.sheets.countersigning import open_countersign
from server.sheets.curve_page import curve_chart, curve_document, curve_page, curve_part, read_curve
from server.sheets.hand_in import evaluate_hand_in, read_hand_in
from server.sheets.parts.curve_points import points_part
from server.sheets.parts.curve_views import curve_views

METHODS = (
    "steepest segment",
    "first derivative",
    "second derivative",
    "gran acid side",
    "gran alkaline side",
    "model fit",
)


@pytest.fixture(scope="module")
def read(demo):
    return demo.read(
        read_curve, demo.summary.curve_sheet_id, 1, who="rosa" if "rosa" in demo.people else "imke"
    )


@pytest.fixture(scope="module")
def page(read):
    return curve_page(read)


def test_page_tells_every_method_with_volume_u_and_words(page):
    assert tuple(one.method for one in page.curve.methods) == METHODS
    for one in page.curve.methods:
        assert one.says
        if one.volume is not None:
            assert float(one.volume) == pytest.approx(float(page.curve.volume), rel=0.02)
            assert 0 < float(one.u) < 1
            assert one.points_used > 1
    assert [one.method for one in page.curve.methods if one.taken] == ["model fit"]


def test_page_says_in_one_sentence_which_to_believe(page):
    assert re.fullmatch(r"Believe the model fit, [\d.]+ mL: .+\.", page.curve.believe)
    assert page.curve.volume in page.curve.believe
    assert page.curve.choice == "Taken by the model fit, as the recipe says."


def test_text_alternative_holds_points_ends_end_point_and_slope(page):
    says = page.curve.says
    for words in (f"{page.curve.points} points", "from pH", f"{page.curve.volume} mL",
                  f"uncertainty {page.curve.u} mL", "Greatest slope", "pH per mL"):  # fmt: skip
        assert words in says
    assert f'aria-label="{says}"' in page.curve.pictures.whole


def test_pictures_carry_no_style_of_their_own(page):
    pictures = page.curve.pictures
    for one in (pictures.whole, pictures.residuals, pictures.near, pictures.slopes, pictures.gran):
        assert one.startswith("<svg")
        assert "style=" not in one
        assert "<script" not in one


def test_probe_of_the_fit_stands_beside_its_last_buffers(page):
    slope, offset = page.curve.probe.lines
    for line, unit in ((slope, "%"), (offset, "mV")):
        assert line.from_curve.endswith(unit)
        assert line.from_buffers.endswith(unit)
        apart = float(line.from_curve.split()[0]) - float(line.from_buffers.split()[0])
        assert float(line.apart.split()[0]) == pytest.approx(apart, abs=0.11)
    assert page.curve.probe.url.startswith("/instruments/")


def test_points_are_those_that_were_written_with_what_used_them(page, read):
    rows = page.table.rows
    assert len(rows) == page.curve.points
    assert any("fit" in row.used_by for row in rows)
    segment = [row for row in rows if "segment" in row.used_by]
    assert len(segment) == 2
    steepest = max(rows[1:], key=lambda row: float(row.slope))
    assert steepest in segment
    document = curve_document(read)
    assert [row.volume for row in rows] == document["volume_mL"]
    assert [row.reading for row in rows] == document["reading"]


def test_long_table_comes_in_parts_and_begins_where_the_curve_jumps():
    from server.lab.curve_entry import CurveEntry

    texts = tuple(f"{at / 100:.2f}" for at in range(250))
    long = CurveEntry("pH", texts, texts, None, {})
    first = points_part(long, None, first=None, url="/u")
    assert (first.rows[0].number, len(first.rows)) == (1, 60)
    last = points_part(long, None, first=241, url="/u")
    assert (last.rows[0].number, last.rows[-1].number) == (241, 250)
    assert [part[:2] for part in last.parts][4] == ("241 to 250", "/u?first=241#points")
    assert points_part(long, None, first=9999, url="/u").rows[-1].number == 250


def test_document_is_an_equivalence_with_the_sheets_choice(read):
    told = curve_document(read)
    assert told["equivalence"]["format"] == "equivalence/1"
    assert (told["taken"], told["recipe_method"], told["problem"]) == (
        "model fit",
        "model fit",
        None,
    )
    json.dumps(told, allow_nan=False)


def test_chart_holds_as_many_points_as_the_curve(read, page):
    told = json.loads(curve_chart(read))
    # 4 bytes each in base64
    assert len(told["points"]["x"]["bdata"]) == -(-page.curve.points * 4 // 3) * 4
    assert {one["method"] for one in told["marks"]} <= set(METHODS)


def test_replicate_without_a_curve_and_a_visitor_are_refused(demo):
    read = demo.read(read_curve, demo.summary.curve_sheet_id, 19, who="imke")
    for opened in (curve_page, curve_part, curve_document, curve_chart):
        with pytest.raises(NotFound, match="Replicate 19 of this sheet has no curve"):
            opened(read)
    with pytest.raises(NotSignedIn):
        demo.read(read_curve, demo.summary.curve_sheet_id, 1, who=None)


def test_countersign_and_hand_in_pages_hold_the_curves(demo):
    page = demo.read(open_countersign, demo.summary.curve_sheet_id, who="ottilie")
    assert [one.replicate for one in page.curves] == [1, 2, 3, 4]
    assert all(one.pictures.residuals and one.problem is None for one in page.curves)
    held = evaluate_hand_in(demo.read(read_hand_in, demo.summary.open_curve_sheet_id, who="imke"))
    assert held.curves
    assert demo.read(open_countersign, demo.summary.waiting_sheet_id, who="ottilie").curves == ()


def test_volume_that_was_signed_stands_beside_another_that_is_found_today(read):
    facts = read.facts
    methods = [
        {**row, "volume_mL": row["volume_mL"] + 0.01} for row in facts.evaluation.result["methods"]
    ]
    result = {**facts.evaluation.result, "methods": methods}
    other = replace(facts, evaluation=replace(facts.evaluation, result=result))
    for view in curve_views(other):
        assert "was signed with" in view.problem
        assert "What was signed stays as it was." in view.problem
