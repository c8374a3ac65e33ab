"""The page of a curve in the browser: whole without the chart script, zoomed into with it."""

import json
from dataclasses import replace
from pathlib import Path
from uuid import uuid4

import pytest
from sqlalchemy import select

from server.intake.curve_upload import SentCurve
from server.procedures.bench import BeginSheet, begin_sheet
from server.procedures.entries import NewEntry, WriteEntries, write_entries
from server.procedures.stores import WriteRecipe, write_recipe
from server.records.tables.stores import Instrument, StandardLot
from tests.browser.conftest import RECIPE

pytestmark = pytest.mark.browser

#: Made up by a charge balance of its own, see the file; 58 points, 2.0833 mmol KHP.
SIMULATED = Path(__file__).parents[1] / "reference" / "curves" / "simulated.json"
BY_PROBE = {
    **RECIPE,
    "weighing": "tared",
    "replicates": 2,
    "end_point": {"mode": "potentiometric", "method": "model fit", "flask_volume_mL": "50"},
}
del BY_PROBE["repeatability"]


@pytest.fixture(scope="module")
def curve_sheet(laboratory):
    """A bench sheet with one weighed replicate and its curve."""
    one = json.loads(SIMULATED.read_text(encoding="utf-8"))["curves"]["khp-manual-burette"]
    lines = [f"{V:.3f};{y:.3f}" for V, y in zip(one["V"], one["y"], strict=True)]
    curve = SentCurve(pasted="\n".join(["volume (mL);pH", *lines]) + "\n")

    def act(procedure, command, who):
        return laboratory.transactions.write(
            lambda session: procedure(
                session, command, actor=laboratory.people[who], now=laboratory.clock()
            )
        )

    recipe = act(write_recipe, WriteRecipe("NaOH by probe", BY_PROBE), "nils")
    things = laboratory.transactions.read(_things)
    begin = BeginSheet(
        lot_code=laboratory.lot, recipe_id=recipe, **things,
    )  # fmt: skip
    sheet = act(begin_sheet, begin, "ida")
    blank = NewEntry(id="", replicate=1, slot="", text="")
    entries = (
        replace(blank, id=str(uuid4()), slot="mass", text="0.4255", unit="g"),
        replace(blank, id=str(uuid4()), slot="curve", curve=curve),
    )
    act(write_entries, WriteEntries(sheet, entries), "ida")
    return sheet


def _things(session):
    found = {
        f"{one.kind}_id": one.id
        for one in session.scalars(select(Instrument))
        if one.kind in {"balance", "burette", "thermometer"}
    }
    return found | {"standard_lot_id": session.scalars(select(StandardLot.id)).one()}


def heard_policy(desk):
    """Every page of this desk reports breaches of its policy as errors (see Desk)."""
    return [one for one in desk.wrong if one.startswith("policy")]


@pytest.mark.parametrize("width", [390, 1440])
def test_curve_page_is_drawn_then_zoomed_into_without_a_breach_of_policy(desks, curve_sheet, width):
    desk = desks("ida", width=width, height=1000)
    page = desk.page
    answer = page.goto(f"/sheets/{curve_sheet}/curves/1")
    assert answer.status == 200
    assert page.locator(".curve-figure svg.chart").count() == 5
    assert "21.7" in page.locator(".big-number").inner_text()
    wider = "(main => main.scrollWidth - main.clientWidth)(document.querySelector('main'))"
    assert page.evaluate(wider) <= 0
    zoom = page.get_by_role("button", name="Zoom")
    zoom.click()
    page.locator("#chart .main-svg").first.wait_for()
    page.locator("#chart .scatterlayer .trace").nth(7).wait_for()
    assert page.locator("#drawn").is_hidden()
    assert page.evaluate(wider) <= 0
    page.get_by_role("button", name="Drawn").click()
    page.locator(".curve-figure svg.chart").first.wait_for()
    assert page.locator("#chart").is_hidden()
    assert heard_policy(desk) == []


def test_curve_page_without_script_is_whole(chromium, laboratory, desks, curve_sheet):
    desk = desks("ida")
    cookies = desk.context.cookies()
    bare = chromium.new_context(base_url=laboratory.address, java_script_enabled=False)
    bare.add_cookies(cookies)
    page = bare.new_page()
    page.goto(f"/sheets/{curve_sheet}/curves/1")
    assert page.locator(".curve-figure svg.chart").count() == 5
    assert page.locator(".points-table tbody tr").count() == 58
    assert page.locator("#switch").is_hidden()
    page.emulate_media(media="print")
    page.locator(".curve-figure.is-whole svg").wait_for()
    bare.close()


def test_bench_page_shows_the_curve_under_the_rows(desks, curve_sheet):
    desk = desks("ida")
    page = desk.page
    page.goto(f"/bench/{curve_sheet}")
    fold = page.locator("#curves #curve-1")
    fold.wait_for()
    assert fold.locator("svg.whole-curve").is_visible()
    assert fold.locator("svg.residuals").is_visible()
    fold.get_by_role("link", name="Every method, every point").click()
    page.wait_for_url("**/curves/1")
