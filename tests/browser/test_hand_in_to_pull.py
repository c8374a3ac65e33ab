"""From the hand-in to the pull at browsers: each page is right at the next load.

Handed in, sent back with remarks on rows, corrected in ink, handed in again, countersigned, its
label printed and scanned, held, released, pulled.
"""

import io
import re
from urllib.parse import urlsplit

import pytest
import zxingcpp
from PIL import Image

from server.records import trail
from tests.browser.test_quam_a2 import begin, write_all

pytestmark = pytest.mark.browser

PASSWORD = "meadow willow heron 4"


def test_sheet_goes_from_the_hand_in_to_the_pull(desks, laboratory):
    ida, lene = desks("ida"), desks("lene", width=1440, height=900)
    nils, visitor = desks("nils", width=1440, height=900), desks(width=390)
    begin(ida.page, laboratory)
    write_all(ida.page)
    bench = ida.page.url
    sheet = f"/countersign/{bench.rsplit('/', 1)[-1]}"
    hand_in(ida.page, bench, name="ida")
    bottle_says(visitor.page, laboratory, "unproven", number=False)

    draft_outlives_the_session(lene, sheet)
    lene.page.get_by_role("button", name="Send back with the remarks").click()
    lene.page.get_by_text("Nothing waits for a second person").wait_for()

    correct_in_ink(ida.page, bench)
    hand_in(ida.page, bench)
    look_at_what_was_done(lene.page, sheet)
    number = countersign(lene.page)
    bottle_says(visitor.page, laboratory, "in force", number=True)

    scanned = print_and_scan(ida.page, laboratory)
    visitor.page.goto(urlsplit(scanned).path)
    visitor.page.get_by_text("0.102").first.wait_for()

    use_it(ida.page, laboratory)
    hold(ida.page, laboratory)
    bottle_says(visitor.page, laboratory, "held", number=False)
    release(nils.page, laboratory)
    bottle_says(visitor.page, laboratory, "in force", number=True)

    pull(nils.page, lene.page, laboratory)
    bottle_says(visitor.page, laboratory, "pulled", number=False)
    visitor.page.goto(urlsplit(scanned).path)
    assert "0.102" not in visitor.page.inner_text("article")
    answer = visitor.page.request.get(f"/api/bottles/{laboratory.bottle}").json()
    assert (answer["state"], answer["in_force"]) == ("pulled", False)
    lene.page.goto(f"/certificates/{number}")
    lene.page.get_by_text("This certificate is pulled").wait_for()
    lene.page.goto(f"/lots/{laboratory.lot}")
    lene.page.locator("#uses").get_by_text("R-2026-17").wait_for()
    assert laboratory.transactions.read(trail.check).holds


def hand_in(page, bench, name=None):
    """The first signature of a session takes the name, a later one the password alone."""
    page.goto(f"{bench}/hand-in")
    for field in page.get_by_label(re.compile("Reason for handing in")).all():
        field.fill("only one weighing was left")
    asked = page.get_by_label("Your sign-in name")
    assert asked.count() == (1 if name else 0)
    if name:
        asked.fill(name)
    page.get_by_label("Your password").fill(PASSWORD)
    page.get_by_role("button", name="Sign and hand in").click()
    page.get_by_text("handed in").first.wait_for()


def draft_outlives_the_session(desk, sheet):
    """Remarks are typed at two rows; the session ends; after signing in they are back."""
    page = desk.page
    page.goto(sheet)
    remark(page, "Replicate 1, Burette, end", "is 18.64 a slip?")
    remark(page, "The whole sheet, Temperature of the titrant", "read in the titrant?")
    page.get_by_label("What should be looked at on the whole").fill("two things <b>here</b>")
    page.locator("#row-remarks").get_by_role("link", name="Replicate 1, Burette, end").wait_for()
    desk.context.clear_cookies()
    page.get_by_role("button", name="Send back with the remarks").click()
    page.get_by_role("heading", name="Sign in").wait_for()
    assert "is 18.64 a slip?" in page.inner_text("main")
    page.get_by_label("Sign-in name").fill("lene")
    page.get_by_label("Password").fill(PASSWORD)
    page.get_by_role("main").get_by_role("button", name="Sign in").click()
    page.wait_for_url(f"**{sheet}")
    page.get_by_text("What you typed here before is back").first.wait_for()
    written = page.get_by_label("Remark on Replicate 1, Burette, end", exact=True)
    assert written.input_value() == "is 18.64 a slip?"
    whole = page.get_by_label("What should be looked at on the whole")
    assert whole.input_value() == "two things <b>here</b>"


def remark(page, where, text):
    field = page.get_by_label(f"Remark on {where}", exact=True)
    field.locator("xpath=..").locator("summary").click()
    field.fill(text)


def correct_in_ink(page, bench):
    page.goto(bench)
    page.get_by_text("two things <b>here</b>").first.wait_for()
    row = page.locator('.row[data-key="1/burette_end/1"]')
    row.get_by_text("is 18.64 a slip?").wait_for()
    page.locator('.row[data-key="0/temperature/1"]').get_by_text("read in the titrant?").wait_for()
    row.locator("button.value").click()
    page.locator("#lit input#reading").fill("18.65")
    page.get_by_text("misread").click()
    page.locator("#lit input#reading").press("Enter")
    page.locator('.row.written[data-key="1/burette_end/1"] .is-server').wait_for()
    page.reload()
    row.get_by_text("18.65").first.wait_for()
    # what was asked stays in view until the sheet is handed in
    row.get_by_text("is 18.64 a slip?").wait_for()


def look_at_what_was_done(page, sheet):
    page.goto("/countersign")
    page.get_by_text("1 entry struck through, 1 time sent back").wait_for()
    page.goto(sheet)
    first = page.get_by_role("region", name="Look at these first")
    struck = first.get_by_role("listitem").filter(has_text="1 entry struck through")
    struck.get_by_role("link", name="Replicate 1, Burette, end").click()
    # the browser's clock is today's, the laboratory's clock stands in May
    first.get_by_text("written by a clock that was more than 2 min wrong").wait_for()
    row = page.locator("#row-1-burette_end-1")
    assert row.locator("s").inner_text().endswith("18.64")
    row.get_by_text("is 18.64 a slip?").wait_for()
    # the trail stands open before the signature
    page.locator(".acts").get_by_text("sent back a bench sheet").wait_for()
    # a draft of an earlier round does not come back
    assert page.get_by_label("What should be looked at on the whole").input_value() == ""


def countersign(page):
    for box in page.locator("input[name=accepted]").all():
        box.check()
    page.get_by_label("Your sign-in name").fill("lene")
    page.get_by_label("Your password").fill(PASSWORD)
    page.get_by_role("button", name="Countersign").click()
    # without the tick for the trail the browser does not even send it
    assert "/countersign/" in page.url
    page.get_by_role("checkbox", name=re.compile("I have read the sheet")).check()
    page.get_by_role("button", name="Countersign").click()
    page.get_by_text("trail of the sheet read up to act").wait_for()
    page.get_by_text("struck through").first.wait_for()
    return page.url.rsplit("/", 1)[-1]


def print_and_scan(page, laboratory):
    page.goto(f"/labels?thing={laboratory.bottle}")
    page.get_by_role("button", name="Print the chosen labels").click()
    page.get_by_role("heading", name="Labels to print").wait_for()
    address = page.locator(".label-picture").get_attribute("src")
    picture = page.request.get(address).body()
    (code,) = zxingcpp.read_barcodes(Image.open(io.BytesIO(picture)))
    return code.text


def use_it(page, laboratory):
    """A result that went out with the bottle, so that a pull finds it."""
    session = page.request.get("/api/session").json()
    answer = page.request.post(
        f"/api/bottles/{laboratory.bottle}/uses",
        data={"result_id": "R-2026-17"},
        headers={"X-Form-Token": session["form_token"]},
    )
    assert answer.status == 201, answer.text()


def hold(page, laboratory):
    page.goto(f"/b/{laboratory.bottle}")
    page.get_by_label("What you saw").fill("cloudy <i>today</i>")
    page.get_by_role("button", name="Hold this bottle").click()
    page.get_by_text("cloudy <i>today</i>").first.wait_for()
    assert page.get_by_role("button", name="Release this bottle").count() == 0


def release(page, laboratory):
    page.goto(f"/b/{laboratory.bottle}")
    page.get_by_label("Why it may be used again").fill("a shadow on the glass")
    page.get_by_role("button", name="Release this bottle").click()
    page.get_by_text("Hold this bottle").wait_for()


def pull(keeper, second, laboratory):
    keeper.goto(f"/lots/{laboratory.lot}")
    keeper.get_by_label("Why the lot should go out of use for good").fill("made with tap water")
    keeper.get_by_role("button", name="Propose to pull it").click()
    keeper.get_by_text("made with tap water").first.wait_for()
    assert keeper.get_by_role("button", name="Confirm: pull this lot").count() == 0
    second.goto(f"/lots/{laboratory.lot}")
    second.get_by_role("button", name="Confirm: pull this lot").click()
    second.locator(".state", has_text="pulled").first.wait_for()


def bottle_says(page, laboratory, state, *, number):
    """What a visitor reads at the next load: the state in a word, and a number only in force."""
    page.goto(f"/b/{laboratory.bottle}")
    card = page.locator("article.bottle")
    card.locator(f'.state[data-state="{state}"]').first.wait_for()
    assert ("0.102" in card.inner_text()) is number
    assert page.get_by_text("Do not use").count() == (0 if number else 1)
