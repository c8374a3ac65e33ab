"""Every page at three widths: no breach of policy, no error, nothing wider than the window."""

import re

import pytest

pytestmark = pytest.mark.browser

WIDTHS = {390: 844, 820: 1180, 1440: 900}
PAGES = {
    None: ("/", "/sign-in", "/about"),
    "ida": (
        *("/bench", "/me", "/countersign", "/stores", "/instruments", "/trail"),
        *("/lots/new", "/labels"),
    ),
    "nils": ("/stores/recipes/new", "/stores/standard-lots/new", "/instruments/new"),
    "runa": ("/people", "/laboratory"),
}


@pytest.mark.parametrize("width", WIDTHS)
@pytest.mark.parametrize("who", PAGES, ids=str)
def test_page_fits_its_window_and_keeps_the_policy(desks, laboratory, who, width):
    desk = desks(who, width=width, height=WIDTHS[width])
    paths = [*PAGES[who], f"/b/{laboratory.bottle}"]
    if who == "ida":
        paths += [f"/bench/begin?lot={laboratory.lot}", f"/labels?thing={laboratory.lot}"]
    for path in paths:
        answer = desk.page.goto(path)
        assert answer.status == 200, path
        assert desk.page.locator("h1").count() == 1, path
        wider = desk.page.evaluate(
            "document.documentElement.scrollWidth - document.documentElement.clientWidth"
        )
        assert wider <= 0, path


def test_unknown_code_answers_with_the_nearest_ones(desks, laboratory):
    desk = desks()
    code = laboratory.bottle
    wrong = code[:3] + code[4] + code[3] + code[5:]
    answer = desk.page.goto(f"/b/{wrong if wrong != code else code[:-1]}")
    assert answer.status == 404
    desk.page.get_by_text(code).first.wait_for()


def test_correction_strikes_through_and_keeps_both_values(desks, laboratory):
    desk = desks("ida")
    page = desk.page
    page.goto(f"/bench/begin?lot={laboratory.lot}")
    page.get_by_role("radio", name="Thermometer 1").check()
    page.get_by_role("button", name="Begin the sheet").click()
    page.locator("#lit").get_by_role("button", name="phenolphthalein", exact=True).click()
    page.locator("#lit input#reading").fill("20,4")
    page.locator("#lit input#reading").press("Enter")
    written = page.locator(".row.written", has_text="Temperature")
    written.wait_for()
    written.get_by_role("button").click()
    page.locator("#lit input#reading").fill("20.6")
    page.locator("#lit .chip").first.click()
    page.locator("#lit input#reading").press("Enter")
    page.locator(".row.written s.struck", has_text="20,4").wait_for()
    page.locator(".row.written", has_text=re.compile("on the server")).first.wait_for()
    page.reload()
    page.locator(".row.written s.struck", has_text="20,4").wait_for()
    assert "20.6" in page.locator(".row.written", has_text="Temperature").inner_text()


def test_reading_written_without_network_waits_on_the_tablet_and_is_sent_later(desks, laboratory):
    desk = desks("ida")
    page = desk.page
    page.goto(f"/bench/begin?lot={laboratory.lot}")
    page.get_by_role("radio", name="Thermometer 1").check()
    page.get_by_role("button", name="Begin the sheet").click()
    page.locator("#lit").get_by_role("button", name="phenolphthalein", exact=True).click()
    page.locator(".row.written", has_text="on the server").wait_for()
    desk.context.set_offline(True)
    page.locator("#lit input#reading").fill("20.4")
    page.locator("#lit input#reading").press("Enter")
    page.locator(".row.written", has_text="on this tablet").wait_for()
    desk.context.set_offline(False)
    page.evaluate("window.dispatchEvent(new Event('online'))")
    page.locator(".row.written", has_text="20.4").filter(has_text="on the server").wait_for()
    page.reload()
    page.locator(".row.written", has_text="20.4").wait_for()


def test_two_browsers_in_one_row_see_both_values_and_the_second_decides(desks, laboratory):
    first, second = desks("ida"), desks("nils")
    first.page.goto(f"/bench/begin?lot={laboratory.lot}")
    first.page.get_by_role("radio", name="Thermometer 1").check()
    first.page.get_by_role("button", name="Begin the sheet").click()
    first.page.locator("#lit").get_by_role("button", name="phenolphthalein", exact=True).click()
    first.page.locator(".row.written", has_text="on the server").wait_for()
    second.page.goto(first.page.url)
    for page, text in ((first.page, "20.4"), (second.page, "20.9")):
        page.locator("#lit input#reading").fill(text)
        page.locator("#lit input#reading").press("Enter")
        page.locator(".row.written", has_text="Temperature").first.wait_for()
    row = second.page.locator(".row.written", has_text="Temperature")
    row.get_by_text("Yours, 20.9, was not taken").wait_for()
    row.get_by_role("button", name="Strike 20.4, write 20.9").click()
    second.page.locator("#lit .chip").first.click()
    second.page.locator("#lit input#reading").press("Enter")
    second.page.locator(".row.written s.struck", has_text="20.4").wait_for()
    second.page.locator(".row.written", has_text="20.9").filter(has_text="on the server").wait_for()
