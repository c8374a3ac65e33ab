"""Example A2 of EURACHEM/CITAC CG 4 (QUAM:2012), the whole way in a browser.

Published: 0.10214 mol/L with U = 0.00020 mol/L, k = 2. The two container weighings are from memory.
"""

import re

import pytest

from server.records import trail
from server.records.tables.trail import TrailRow

pytestmark = pytest.mark.browser

KEYS = {".": "Decimal point"}
READINGS = ("60.5450", "60.1562", "0.00", "18.64")


def test_quam_a2_from_the_first_weighing_to_the_number_on_the_bottle(desks, laboratory):
    ida, lene, visitor = desks("ida"), desks("lene", width=1440, height=900), desks(width=390)

    # nothing is public before it is countersigned
    visitor.page.goto(f"/b/{laboratory.bottle.lower()}")
    assert "0.102" not in visitor.page.content()
    visitor.page.get_by_text("unproven").first.wait_for()

    begin(ida.page, laboratory)
    write_all(ida.page)
    sheet_url = ida.page.url
    hand_in(ida.page)

    # one's own work: the page says so and offers no signature
    number = sheet_url.rsplit("/", 1)[-1]
    ida.page.goto(f"/countersign/{number}")
    assert ida.page.get_by_role("button", name="Countersign").count() == 0
    ida.page.get_by_text("somebody else countersigns").first.wait_for()
    visitor.page.reload()
    assert "0.102" not in visitor.page.content()

    countersign(lene.page)
    lene.page.get_by_role("heading", name=re.compile("certificate", re.IGNORECASE)).first.wait_for()
    certificate = lene.page.inner_text("main")
    assert "0.10214" in certificate
    assert "0.00020 mol/L" in certificate
    assert "only one weighing was left" in certificate
    assert "Ida Mohnke" in certificate

    visitor.page.reload()
    card = visitor.page.inner_text("main")
    assert "0.10214" in card
    assert "± 0.00020 mol/L" in card
    assert re.search(r"k = 2\.0", card)
    assert "visual, phenolphthalein" in card
    assert "18 May 2026" in card  # 14 days after 4 May
    assert not any(name in visitor.page.content() for name in ("Mohnke", "Tiedt", "Obermark"))

    answer = visitor.page.request.get(f"/api/bottles/{laboratory.bottle}").json()
    assert answer["in_force"] is True
    assert answer["concentration"]["reported"] == "0.10214 ± 0.00020 mol/L (k = 2.0)"
    assert answer["concentration"]["value"] == pytest.approx(0.102136, abs=5e-7)

    acts = laboratory.transactions.read(
        lambda session: [row.act for row in session.query(TrailRow).order_by(TrailRow.seq)]
    )
    for act in ("began a bench sheet", "wrote entries", "handed in a bench sheet"):
        assert act in acts
    assert any("countersigned" in act for act in acts)
    assert laboratory.transactions.read(trail.check).holds


def begin(page, laboratory):
    page.goto("/bench")
    page.get_by_label("Code of the lot or of one of its bottles").fill(laboratory.bottle.lower())
    page.get_by_role("button", name="Go on").click()
    page.get_by_text("Strongly alkaline").wait_for()
    for name in ("KHP lot 7", "Balance 1", "Burette 1", "Thermometer 1"):
        page.get_by_role("radio", name=name).check()
    page.get_by_role("button", name="Begin the sheet").click()
    page.locator("#lit").wait_for()


def write_all(page):
    page.locator("#lit").get_by_role("button", name="phenolphthalein", exact=True).click()
    for text in ("20.0", *READINGS):
        field = page.locator("#lit input#reading")
        field.wait_for()
        row = page.locator(".row.next").get_attribute("data-key")
        if text == "18.64":
            # with the keys of the pad, as gloves would
            for key in text:
                page.locator("#pad").get_by_role(
                    "button", name=KEYS.get(key, key), exact=True
                ).tap()
            page.locator("#pad").get_by_role("button", name=re.compile("Write")).tap()
        else:
            field.fill(text)
            field.press("Enter")
        page.locator(f'.row.written[data-key="{row}"]').wait_for()
    page.get_by_role("link", name="Read it over and hand in").wait_for()


def hand_in(page):
    page.get_by_role("link", name="Read it over and hand in").click()
    page.get_by_label(re.compile("replicates")).fill("only one weighing was left")
    page.get_by_label(re.compile("burette use")).fill("the portion was larger than planned")
    page.get_by_label("Your sign-in name").fill("ida")
    page.get_by_label(re.compile("password", re.IGNORECASE)).fill("meadow willow heron 4")
    page.get_by_role("button", name="Sign and hand in").click()
    page.get_by_text("handed in").first.wait_for()


def countersign(page):
    page.goto("/countersign")
    page.get_by_role("link", name=re.compile("NaOH|S-2026")).first.click()
    page.get_by_text("0.10214").first.wait_for()
    for name in ("replicates", "burette use"):
        page.get_by_role("checkbox", name=re.compile(name)).check()
    page.get_by_role("checkbox", name=re.compile("I have read the sheet")).check()
    page.get_by_label("Your sign-in name").fill("lene")
    page.get_by_label(re.compile("password", re.IGNORECASE)).fill("meadow willow heron 4")
    page.get_by_role("button", name="Countersign").click()
