"""A label printed at a browser, scanned, and its address opened; hazards; settings."""

import io
import re
from urllib.parse import urlsplit

import pytest
import zxingcpp
from PIL import Image

pytestmark = pytest.mark.browser


def test_label_is_printed_scanned_opened_and_printed_again_with_a_reason(desks, laboratory):
    ida = desks("ida")
    page = ida.page
    page.goto(f"/b/{laboratory.bottle}")
    page.get_by_role("link", name="print, and printed so far").click()
    assert page.get_by_role("checkbox", name=re.compile(laboratory.bottle)).is_checked()
    page.get_by_label("Onto").select_option("62x40")
    page.get_by_role("button", name="Print the chosen labels").click()
    page.get_by_role("heading", name="Labels to print").wait_for()
    # the picture is shown, not broken
    shown = page.locator(".label-picture")
    assert shown.evaluate("(one) => one.decode().then(() => one.naturalWidth)") > 400
    with page.expect_download() as taken:
        page.get_by_role("link", name="PDF to print").click()
    assert taken.value.suggested_filename.endswith(".pdf")

    picture = page.request.get(shown.get_attribute("src")).body()
    (code,) = zxingcpp.read_barcodes(Image.open(io.BytesIO(picture)))
    assert code.text == f"{laboratory.address.upper()}/B/{laboratory.bottle}"
    visitor = desks()
    assert visitor.page.goto(urlsplit(code.text).path).status == 200
    visitor.page.get_by_text(laboratory.bottle).first.wait_for()

    page.goto(f"/labels?thing={laboratory.bottle}")
    page.get_by_role("button", name="Print the chosen labels").click()
    page.get_by_text("had a label before").first.wait_for()
    page.get_by_label("Why it is printed again").fill("smeared by acetone")
    page.get_by_role("button", name="Print the chosen labels").click()
    page.get_by_role("heading", name="Labels to print").wait_for()
    page.get_by_role("link", name="All labels of the lot").click()
    page.get_by_role("cell", name="smeared by acetone").wait_for()


def test_settings_are_saved_and_a_confirmation_is_kept_and_withdrawn(desks):
    runa = desks("runa")
    page = runa.page
    page.goto("/people")
    page.get_by_role("link", name="The laboratory's settings").click()
    page.get_by_label("Country, two letters").fill("de")
    page.get_by_role("button", name="Save the settings").click()
    page.wait_for_load_state()
    assert page.get_by_label("Country, two letters").input_value() == "DE"
    page.get_by_text("Write down a confirmation").click()
    page.get_by_label("Titrant").fill("NaOH")
    page.get_by_label("Nominal concentration").fill("0,1")
    page.get_by_label("GHS05, corrosion").check()
    page.get_by_label("Signal word").select_option("Warning")
    page.get_by_label("Confirmed by").fill("Nils Obermark")
    page.get_by_label("On", exact=True).fill("2026-05-01")
    page.get_by_role("button", name="Keep it").click()
    page.get_by_role("heading", name="NaOH 0.1 mol/L in water").wait_for()
    page.get_by_text("Withdraw", exact=False).first.click()
    page.get_by_label("Why labels shall not bear it any more").fill("classified anew")
    page.get_by_role("button", name="Withdraw it").click()
    page.get_by_text("Nothing is confirmed").wait_for()
