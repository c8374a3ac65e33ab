"""A curve from the meter's file to the second signature: shown, written, replaced, compared."""

import re
from random import Random
from uuid import uuid4

import pytest

from server.demo.simulated_curve import Flask, curve_text
from server.lab.ink import standing
from server.procedures.bench import BeginSheet, begin_sheet
from server.procedures.entries import NewEntry, WriteEntries, write_entries
from server.procedures.stores import WriteRecipe, write_recipe
from server.records.queries.load_sheet import load_sheet_facts
from server.records.tables.stores import Instrument, StandardLot
from tests.browser.conftest import PASSWORD, RECIPE

pytestmark = pytest.mark.browser

PROBE_RECIPE = {
    **{key: value for key, value in RECIPE.items() if key != "liquid_expansion"},
    "title": "Sodium hydroxide by probe",
    "replicates": 3,
    "end_point": {"mode": "potentiometric", "method": "model fit", "flask_volume_mL": "50"},
    "limits": {"replicates_advised": "3"},
}
MASSES = (("60.3166", "60.0000"), ("60.3200", "60.0000"), ("60.3150", "60.0000"))
#: Alkalinity of the lye in mol/L, carbonate's share of it, and what is left that titrates.
LYE, CARBONATE = 0.1003, 0.003
EFFECTIVE = LYE * (1 - CARBONATE)


@pytest.fixture(scope="module")
def sheet(laboratory):
    """A sheet on which all is weighed and no curve is written yet."""

    def act(procedure, command, who):
        return laboratory.transactions.write(
            lambda session: procedure(
                session, command, actor=laboratory.people[who], now=laboratory.clock()
            )
        )

    def found(session):
        tools = {row.kind: row.id for row in session.query(Instrument)}
        return tools, session.query(StandardLot).one().id

    tools, standard = laboratory.transactions.read(found)
    recipe = act(write_recipe, WriteRecipe("NaOH by probe", PROBE_RECIPE), "nils")
    begin = BeginSheet(
        laboratory.lot, recipe, standard, tools["balance"], tools["burette"], tools["thermometer"]
    )
    begun = act(begin_sheet, begin, "ida")
    lines = [(0, "temperature", "20.0")]
    for number, (before, after) in enumerate(MASSES, start=1):
        lines += [
            (number, "container_and_standard", before),
            (number, "container_less_standard", after),
        ]
    entries = tuple(NewEntry(str(uuid4()), *line) for line in lines)
    act(write_entries, WriteEntries(begun, entries), "ida")
    return begun


@pytest.fixture(scope="module")
def runs():
    """The meter's files of three replicates, as text."""
    random = Random(4)
    texts = []
    for before, after in MASSES:
        amount = 1000 * (float(before) - float(after)) / 204.2212
        texts.append(curve_text(Flask(amount, LYE, 20.0, CARBONATE), random))
    return texts


def row(page, replicate):
    return page.locator(f'.row[data-key="{replicate}/curve/1"]')


def drop_file(page, name, text):
    page.set_input_files(
        "#curve-file", {"name": name, "mimeType": "text/csv", "buffer": text.encode()}
    )


def write(page, replicate):
    page.locator("#curve-write").click()
    row(page, replicate).locator(".is-server").wait_for()


def test_curve_is_seen_with_every_volume_before_it_is_written_and_compared_at_the_end(
    desks, laboratory, sheet, runs
):
    ida, lene = desks("ida"), desks("lene", width=1440, height=900)
    ida.page.goto(f"/bench/{sheet}")
    ida.page.locator("#curve-row").wait_for()
    write_a_dropped_file(ida.page, laboratory, sheet, runs[0])
    write_pasted_text_with_a_bad_row(ida.page, runs[1])
    write_after_the_network_came_back(ida, runs[2])
    strike_the_pasted_curve_and_write_its_file(ida.page, runs[1])
    take_another_method_for_the_third(ida.page)
    hand_in(ida.page)
    countersign(lene.page, sheet)
    assert "potentiometric" in lene.page.inner_text("main")
    card = lene.page.request.get(f"/api/bottles/{laboratory.bottle}").json()
    assert card["concentration"]["value"] == pytest.approx(EFFECTIVE, rel=5e-4)


def write_a_dropped_file(page, laboratory, sheet, text):
    """What was recognised and every volume are seen; only then something is stored."""
    drop_file(page, "run1.csv", text)
    page.locator("#curve-write").wait_for()
    told = page.locator(".curve-preview")
    assert "Taken: volume in mL from “Volume (mL)”, pH from “pH”." in told.inner_text()
    volumes = page.locator("#curve-volumes").inner_text()
    picture = told.locator(".chart-box svg").text_content()
    for method in ("model fit", "first derivative", "gran acid side", "steepest segment"):
        assert method in volumes
        assert method in picture
    assert curves_on(laboratory, sheet) == {}
    write(page, 1)
    assert set(curves_on(laboratory, sheet)) == {(1, "curve", 1)}
    shown = page.locator("#curves")
    shown.locator("svg").first.wait_for()
    assert "What the model leaves" in shown.inner_text()


def write_pasted_text_with_a_bad_row(page, text):
    """The row is pointed at and can be left out; it stays on the record."""
    page.locator("#reading").fill(text.replace("\n6.00;", "\n6.00;err"))
    page.get_by_role("button", name="Look at it").click()
    page.locator("#curve-note").wait_for()
    assert "Row 5, column 2" in page.locator("#curve-note").inner_text()
    page.get_by_role("button", name="Leave out row 5").click()
    page.locator("#curve-write").wait_for()
    assert "Left out by hand. Row 5" in page.locator(".curve-preview").inner_text()
    write(page, 2)


def write_after_the_network_came_back(ida, text):
    """Without a network that is said, and what was chosen outlives a reload."""
    page = ida.page
    ida.context.set_offline(True)
    drop_file(page, "run3.csv", text)
    page.locator("#curve-retry").wait_for()
    assert "kept on this tablet, nothing is lost" in page.locator("#curve-note").inner_text()
    ida.context.set_offline(False)
    page.reload()
    page.locator("#curve-write").wait_for()
    assert "run3.csv" in page.locator("#curve-row").inner_text()
    write(page, 3)


def strike_the_pasted_curve_and_write_its_file(page, text):
    """The struck curve stays readable; the original comes back byte for byte."""
    row(page, 2).get_by_role("button", name=re.compile("Correct it")).click()
    drop_file(page, "run2.csv", text)
    page.locator("#curve-write").click()
    page.get_by_text("Say why the old value is struck through").first.wait_for()
    page.get_by_label("In your own words").fill("the file itself, with no row left out")
    page.locator("#curve-write").click()
    row(page, 2).locator(".is-server").wait_for()
    assert "run2.csv" in row(page, 2).inner_text()
    assert "pasted.txt" in row(page, 2).locator("s.struck").inner_text()
    with page.expect_download() as fetched:
        row(page, 2).get_by_role("link", name="Its original file").click()
    assert fetched.value.path().read_bytes() == text.encode()


def take_another_method_for_the_third(page):
    """Another method than the recipe's is an entry with its reason."""
    page.locator('[data-key="3/end_point_method/1"] button.value').click()
    page.get_by_role("button", name="first derivative").click()
    page.get_by_text("Say first why another method is taken").first.wait_for()
    page.get_by_label("In your own words").fill("to see how it compares")
    page.get_by_role("button", name="first derivative").click()
    page.locator('.row.written[data-key="3/end_point_method/1"] .is-server').wait_for()


def hand_in(page):
    page.get_by_role("link", name="Read it over and hand in").click()
    page.get_by_role("button", name="Sign and hand in").wait_for()
    for field in page.get_by_label(re.compile("Reason for handing in")).all():
        field.fill("seen, and kept")
    page.get_by_label("Your sign-in name").fill("ida")
    page.get_by_label("Your sign-in name").fill("ida")
    page.get_by_label(re.compile("password", re.IGNORECASE)).fill(PASSWORD)
    page.get_by_role("button", name="Sign and hand in").click()
    page.get_by_text("handed in").first.wait_for()


def countersign(page, sheet):
    """The second person sees curve, residuals and the comparison, and signs."""
    page.goto(f"/countersign/{sheet}")
    seen = page.text_content("main")
    for words in ("What the model leaves", "End-point methods compared", "run2.csv", "pasted.txt"):
        assert words in seen, words
    assert "to see how it compares" in seen
    for box in page.get_by_role("checkbox").all():
        box.check()
    page.get_by_label("Your sign-in name").fill("lene")
    page.get_by_label("Your sign-in name").fill("lene")
    page.get_by_label(re.compile("password", re.IGNORECASE)).fill(PASSWORD)
    page.get_by_role("button", name="Countersign").click()
    page.get_by_role("heading", name=re.compile("certificate", re.IGNORECASE)).first.wait_for()


def curves_on(laboratory, sheet):
    facts = laboratory.transactions.read(lambda session: load_sheet_facts(session, sheet))
    return {place: entry for place, entry in standing(facts.entries).items() if place[1] == "curve"}
