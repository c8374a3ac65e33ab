"""Labels of bottles: printed, and their QR codes read by an independent decoder (zxing-cpp)."""

import io
import re
from dataclasses import replace
from datetime import UTC, date, datetime
from random import Random

import numpy as np
import pypdf
import pypdfium2
import pytest
import zxingcpp
from PIL import Image

from server.lab.codes import new_code, read_code
from server.lab.refusal import Unacceptable
from server.reports.labels.bottle_label import (
    BottleLabel,
    ConfirmedHazards,
    PrintedValue,
    Reprint,
    bottle_url,
)
from server.reports.labels.sheet import Printing, labels_pdf, labels_pictures, module_size
from server.reports.labels.stock import SHEETS, find_stock

AT = datetime(2026, 12, 1, 23, 30, tzinfo=UTC)
BASE = "https://ledger.example"
CODES = [new_code(Random(seed)) for seed in range(30)]
LABEL = BottleLabel(
    code=CODES[0],
    titrant="Sodium hydroxide",
    nominal="0.1 mol/L",
    lot="NaOH 0.1 mol/L, 2026-11-19",
    bottle=2,
    made_on="19 Nov 2026",
    laboratory="Tarnbeck Waterworks, Laboratory",
    address="4 Filter Lane, Tarnbeck",
    zone="Europe/Zurich",
)
HAZARDS = ConfirmedHazards(
    ("GHS05",),
    "Danger",
    ("H314 Causes severe skin burns and eye damage.",),
    "Jonas Halework",
    date(2026, 11, 3),
)
VALUE = PrintedValue("0.10211 ± 0.00010 mol/L (k = 2.0)", "TL-2026-0005", "11 Dec 2026")


def printing(stock="100x50", **more):
    return Printing(find_stock(stock), BASE, AT, **more)


def text_of(pdf):
    pages = pypdf.PdfReader(io.BytesIO(pdf)).pages
    joined = " ".join(page.extract_text() for page in pages).replace("\u200b", "")
    return re.sub(r"\s+", " ", joined)


def decoded(picture):
    found = zxingcpp.read_barcodes(Image.open(io.BytesIO(picture)))
    assert all(one.format == zxingcpp.BarcodeFormat.QRCode for one in found)
    return [one.text for one in found]


@pytest.mark.parametrize("dots", [203, 300, 600])
@pytest.mark.parametrize("stock", ["100x50", "62x40", "62x29", "50x30", "a4-21", "a4-8"])
def test_label_picture_is_read_as_the_bottles_address(stock, dots) -> None:
    if stock.startswith("a4") and dots > 300:
        dots = 300
    (picture,) = labels_pictures([LABEL], printing(stock, dots_per_inch=dots))
    (address,) = decoded(picture)
    assert address == f"HTTPS://LEDGER.EXAMPLE/B/{LABEL.code}"
    assert read_code(address.rpartition("/")[2]) == LABEL.code


def test_label_sheet_in_pdf_is_read_bottle_by_bottle() -> None:
    """Drawn by PDFium at 300 dots per inch."""
    labels = [replace(LABEL, code=code) for code in CODES[:20]]
    pdf = labels_pdf(labels, printing("a4-14"))
    document = pypdfium2.PdfDocument(pdf)
    found = []
    for page in document:
        drawn = page.render(scale=300 / 72, grayscale=True).to_numpy().squeeze()
        found.append({one.text for one in zxingcpp.read_barcodes(np.ascontiguousarray(drawn))})
    document.close()
    assert [len(page) for page in found] == [14, 6]
    assert set.union(*found) == {f"HTTPS://LEDGER.EXAMPLE/B/{code}" for code in CODES[:20]}


def test_label_sheet_that_was_begun_leaves_its_used_places_free() -> None:
    labels = [replace(LABEL, code=code) for code in CODES[:3]]
    (picture,) = labels_pictures(labels, printing("a4-8", first_place=4, dots_per_inch=150))
    drawn = np.asarray(Image.open(io.BytesIO(picture)).convert("L"))
    stock = SHEETS["a4-8"]
    inked = []
    for place in range(stock.places):
        x, y = (round(side / 25.4 * 150) for side in stock.corner(place))
        cut = drawn[
            y : y + round(stock.height / 25.4 * 150), x : x + round(stock.width / 25.4 * 150)
        ]
        inked.append(bool((cut < 128).any()))
    assert inked == [False] * 3 + [True] * 3 + [False] * 2


@pytest.mark.parametrize("name", list(SHEETS))
def test_stock_lies_within_its_page_and_labels_do_not_overlap(name) -> None:
    stock = SHEETS[name]
    corners = [stock.corner(place) for place in range(stock.places)]
    assert min(x for x, _ in corners) >= 0
    assert max(x for x, _ in corners) + stock.width <= stock.page_width + 0.001
    assert max(y for _, y in corners) + stock.height <= stock.page_height + 0.001
    assert min(y for _, y in corners) >= 0
    assert (stock.page_width, stock.page_height) in {(210.0, 297.0), (215.9, 279.4)}
    assert len(set(corners)) == stock.places
    assert stock.gap_x >= 0
    assert stock.gap_y >= 0


def test_label_says_code_and_nominal_and_no_certified_number() -> None:
    says = text_of(labels_pdf([LABEL], printing()))
    assert f"{LABEL.code[:4]} {LABEL.code[4:]}" in says
    assert "nominal 0.1 mol/L" in says
    assert "Value and state: scan, or look up the code." in says
    assert "4 Filter Lane, Tarnbeck" in says
    assert "±" not in says


def test_label_prints_the_value_with_its_certificate_where_that_is_wanted() -> None:
    says = text_of(labels_pdf([replace(LABEL, value=VALUE)], printing()))
    assert "0.10211 ± 0.00010 mol/L (k = 2.0)" in says
    assert "Certificate TL-2026-0005, valid until 11 Dec 2026." in says


@pytest.mark.parametrize("part", ["reported", "certificate", "valid_until"])
def test_label_value_without_its_certificate_or_day_is_refused(part) -> None:
    with pytest.raises(Unacceptable, match="certificate"):
        labels_pdf([replace(LABEL, value=replace(VALUE, **{part: " "}))], printing())


def red_pixels(picture):
    drawn = np.asarray(Image.open(io.BytesIO(picture)).convert("RGB")).astype(int)
    return int(((drawn[..., 0] > 180) & (drawn[..., 1] < 90) & (drawn[..., 2] < 90)).sum())


def test_label_has_pictograms_only_where_they_were_confirmed() -> None:
    plain, confirmed = (
        labels_pictures([one], printing(dots_per_inch=203))[0]
        for one in (LABEL, replace(LABEL, hazards=HAZARDS))
    )
    assert red_pixels(plain) == 0
    assert red_pixels(confirmed) > 200
    assert "Confirmed 3 Nov 2026, Jonas Halework." in text_of(
        labels_pdf([replace(LABEL, hazards=HAZARDS)], printing())
    )


def test_label_pictogram_has_sides_of_ten_millimetres_at_least() -> None:
    """Measured on the picture: the diamond from tip to tip is 10 mm times the root of 2."""
    (picture,) = labels_pictures([replace(LABEL, hazards=HAZARDS)], printing(dots_per_inch=600))
    drawn = np.asarray(Image.open(io.BytesIO(picture)).convert("RGB")).astype(int)
    red = (drawn[..., 0] > 180) & (drawn[..., 1] < 90) & (drawn[..., 2] < 90)
    columns = np.flatnonzero(red.any(axis=0))
    assert (columns[-1] - columns[0] + 1) / 600 * 25.4 >= 10 * 2**0.5 - 0.1


@pytest.mark.parametrize(
    ("change", "field"),
    [
        ({"confirmed_by": "  "}, "hazards.confirmed_by"),
        ({"pictograms": ("GHS10",)}, "hazards.pictograms"),
        ({"pictograms": ("../../secret",)}, "hazards.pictograms"),
        ({"signal_word": "Beware"}, "hazards.signal_word"),
    ],
)
def test_label_hazards_that_are_none_are_refused_by_field(change, field) -> None:
    with pytest.raises(Unacceptable) as refused:
        labels_pdf([replace(LABEL, hazards=replace(HAZARDS, **change))], printing())
    assert refused.value.field == field


@pytest.mark.parametrize("key", [f"GHS0{number}" for number in range(1, 10)])
def test_label_knows_all_nine_pictograms(key) -> None:
    hazards = replace(HAZARDS, pictograms=(key,))
    assert red_pixels(
        labels_pictures([replace(LABEL, hazards=hazards)], printing(dots_per_inch=203))[0]
    )


def test_label_that_is_printed_again_says_when_and_why() -> None:
    """Half past eleven at night in Greenwich is the next day in Zurich."""
    again = replace(LABEL, reprint=Reprint("label lost in the wash", AT))
    assert "Printed again 2 Dec 2026: label lost in the wash" in text_of(
        labels_pdf([again], printing())
    )
    with pytest.raises(Unacceptable, match="with a reason"):
        labels_pdf([replace(LABEL, reprint=Reprint("  ", AT))], printing())


def test_label_whose_words_do_not_fit_is_refused_and_not_cut_off() -> None:
    hazards = replace(HAZARDS, statements=("H314 Causes severe skin burns.",) * 8)
    with pytest.raises(Unacceptable, match="does not fit on 62 × 40 mm"):
        labels_pdf([replace(LABEL, hazards=hazards)], printing("62x40"))


@pytest.mark.parametrize("markup", ['#panic("x")', "$a$ *b* [c] <d> \\ @e `f`", "x" * 90])
def test_label_shows_markup_in_names_as_it_was_typed(markup) -> None:
    says = text_of(labels_pdf([replace(LABEL, titrant=markup, lot=markup)], printing()))
    assert says.replace(" ", "").count(markup.replace(" ", "")) == 2


def test_label_keeps_long_names_within_its_edges() -> None:
    long = replace(LABEL, titrant="W" * 60, lot="W" * 60, bottle=12)
    (picture,) = labels_pictures([long], printing(dots_per_inch=203))
    drawn = np.asarray(Image.open(io.BytesIO(picture)).convert("L"))
    assert not (drawn[:, -4:] < 128).any()
    assert not (drawn[:4] < 128).any()
    assert not (drawn[-4:] < 128).any()


def test_label_module_is_whole_dots_and_half_a_millimetre_at_least() -> None:
    for dots in (203, 300, 600):
        for room in (19.0, 22.0, 30.0, 50.0):
            module = module_size(37, room, dots)
            assert module / 25.4 * dots == pytest.approx(round(module / 25.4 * dots), abs=1e-9)
            assert 0.5 <= module <= 0.85
            assert 37 * module <= room + 1e-9
    with pytest.raises(Unacceptable, match=r"needs 0\.5 mm"):
        module_size(37, 18.0, 203)


def test_label_qr_keeps_a_quiet_zone_of_four_modules() -> None:
    """ISO/IEC 18004: measured on the picture, left, above and below."""
    (picture,) = labels_pictures([LABEL], printing(dots_per_inch=203))
    drawn = np.asarray(Image.open(io.BytesIO(picture)).convert("L")) < 128
    module = 6  # dots of 203 to the inch: 0.75 mm
    code = drawn[:, : drawn.shape[1] // 4]
    rows, columns = np.flatnonzero(code.any(axis=1)), np.flatnonzero(code.any(axis=0))
    assert columns[0] >= 4 * module
    assert rows[0] >= 4 * module
    assert code.shape[0] - 1 - rows[-1] >= 4 * module


@pytest.mark.parametrize(
    ("base", "says"),
    [
        ("ledger.example", "http address"),
        ("javascript:alert(1)", "http address"),
        ("https://ledger.example/?a=1", "question marks"),
        ("", "http address"),
    ],
)
def test_label_address_that_is_none_is_refused(base, says) -> None:
    with pytest.raises(Unacceptable, match=says):
        bottle_url(base, LABEL.code)


def test_label_address_keeps_a_path_before_it_as_it_is() -> None:
    assert bottle_url("https://a.example/Lab/", LABEL.code) == (
        f"HTTPS://A.EXAMPLE/Lab/B/{LABEL.code}"
    )
    with pytest.raises(Unacceptable, match="no code"):
        bottle_url(BASE, "ABCDEFGH")


@pytest.mark.parametrize(
    ("labels", "more", "field"),
    [
        ([], {}, "labels"),
        ([LABEL] * 501, {}, "labels"),
        ([LABEL], {"stock": "a4-8", "first_place": 9}, "first_place"),
        ([LABEL], {"first_place": 0}, "first_place"),
        ([LABEL], {"dots_per_inch": 72}, "dots_per_inch"),
        ([LABEL], {"dots_per_inch": 100_000}, "dots_per_inch"),
    ],
)
def test_label_printing_that_cannot_be_is_refused_by_field(labels, more, field) -> None:
    with pytest.raises(Unacceptable) as refused:
        labels_pdf(labels, printing(**more))
    assert refused.value.field == field


@pytest.mark.parametrize("name", ["", "a5", "10x10", "1e9x1e9", "nanxnan", "100", "x"])
def test_stock_that_is_none_is_refused(name) -> None:
    with pytest.raises(Unacceptable):
        find_stock(name)


def test_labels_are_the_same_bytes_each_time() -> None:
    assert labels_pdf([LABEL], printing()) == labels_pdf([LABEL], printing())
