"""Every page of an instrument at three widths: no breach of policy, no error, nothing too wide."""

import pytest

pytestmark = pytest.mark.browser

WIDTHS = {390: 844, 820: 1180, 1440: 900}


@pytest.mark.parametrize("width", WIDTHS)
def test_page_of_an_instrument_fits_its_window_and_keeps_the_policy(desks, laboratory, width):
    desk = desks("nils", width=width, height=WIDTHS[width])
    listed = desk.page.request.get("/api/instruments").json()["instruments"]
    for one in listed:
        here = f"/instruments/{one['id']}"
        paths = ["", "/calibrations/1", "/calibrations/new", "/runs/new", "/imports/new"]
        for path in [*paths, *(["/class/new"] if one["kind"] == "burette" else [])]:
            answer = desk.page.goto(here + path)
            assert answer.status == 200, path
            assert desk.page.locator("h1").count() == 1, path
            wider = desk.page.evaluate(
                "document.documentElement.scrollWidth - document.documentElement.clientWidth"
            )
            assert wider <= 0, (one["kind"], path)
            # fields for gloves: at least 48 px
            low = desk.page.evaluate(
                "[...document.querySelectorAll('main .cell input, main .field input[type=text]')]"
                ".map((one) => one.getBoundingClientRect()).filter((one) => one.width > 0)"
                ".filter((one) => one.height < 47.5).length"
            )
            assert low == 0, (one["kind"], path)
