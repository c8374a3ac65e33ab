"""The certificate on paper, opened by pypdf and drawn by PDFium."""

import io
import json
import re
from concurrent.futures import ThreadPoolExecutor
from copy import deepcopy
from dataclasses import replace

import pypdf
import pypdfium2
import pytest

from server.lab.canonical import digest
from server.reports.certificate.pdf import certificate_pdf, certificate_pictures
from server.reports.signed_certificate import read_signed, sign_certificate


def opened(pdf):
    return pypdf.PdfReader(io.BytesIO(pdf))


def pages_of(pdf):
    return [page.extract_text() for page in opened(pdf).pages]


def text_of(pdf):
    """The whole text, spaces as one and without the places to break that long words were given."""
    return re.sub(r"\s+", " ", " ".join(pages_of(pdf)).replace("\u200b", ""))


@pytest.fixture(scope="module")
def jws(issued, keys):
    return sign_certificate(issued, keys.current)


@pytest.fixture(scope="module")
def pdf(issued, jws):
    return certificate_pdf(issued, jws=jws)


@pytest.fixture(scope="module")
def text(pdf):
    return text_of(pdf)


def changed(issued, **parts):
    """The same certificate with parts of its document otherwise."""
    document = deepcopy(dict(issued.document))
    for key, value in parts.items():
        document[key] = {**document[key], **value} if isinstance(value, dict) else value
    return replace(issued, document=document)


def test_certificate_attaches_the_document_as_it_is_kept(issued, pdf) -> None:
    attached = opened(pdf).attachments["TL-2026-0005.json"][0]
    assert digest(attached.decode()) == issued.document_digest
    assert json.loads(attached) == issued.document


def test_certificate_attaches_its_signature(issued, pdf, keys) -> None:
    attached = opened(pdf).attachments["TL-2026-0005.jws"][0].decode()
    assert read_signed(attached, keys.jwks())["document_digest"] == issued.document_digest


def test_certificate_without_a_signature_attaches_the_document_alone(issued) -> None:
    assert list(opened(certificate_pdf(issued)).attachments) == ["TL-2026-0005.json"]


def test_certificate_says_that_it_is_archival_and_accessible(pdf) -> None:
    """The claims of ISO 19005-3 and ISO 14289-1 in the file's XMP; the typesetter checks them."""
    reader = opened(pdf)
    xmp = reader.root_object["/Metadata"].get_data().decode()
    assert re.search(r"pdfaid:part>3<", xmp)
    assert re.search(r"pdfaid:conformance>A<", xmp)
    assert re.search(r"pdfuaid:part>1<", xmp)
    assert reader.root_object["/MarkInfo"]["/Marked"]
    assert reader.root_object["/Lang"] == "en"
    relations = [one.get_object()["/AFRelationship"] for one in reader.root_object["/AF"]]
    assert relations == ["/Alternative", "/Alternative"]


def test_certificate_embeds_every_font(pdf) -> None:
    fonts = {
        font["/BaseFont"]: font
        for page in opened(pdf).pages
        for font in (one.get_object() for one in page["/Resources"]["/Font"].values())
    }
    assert fonts
    for font in fonts.values():
        (inner,) = font["/DescendantFonts"]
        described = inner.get_object()["/FontDescriptor"]
        assert "/FontFile2" in described or "/FontFile3" in described
    names = {name.partition("+")[2] for name in fonts}
    assert {re.match(r"[A-Za-z]+", name).group() for name in names} <= {
        "LibertinusSerif", "DejaVuSansMono",
    }  # fmt: skip


def test_certificate_is_a4_and_each_page_names_number_and_count(issued, pdf) -> None:
    reader = opened(pdf)
    for at, page in enumerate(reader.pages, start=1):
        assert [round(float(side)) for side in page.mediabox[2:]] == [595, 842]
        says = f"Certificate {issued.number}, page {at} of {len(reader.pages)}"
        assert says in re.sub(r"\s+", " ", page.extract_text())


def test_certificate_on_letter_paper_is_whole_within_its_margins(issued) -> None:
    """Drawn by PDFium at 72 dots per inch: 612 by 792 points."""
    pdf = certificate_pdf(replace(issued, paper="us-letter"))
    document = pypdfium2.PdfDocument(pdf)
    for page in document:
        dark = page.render(scale=1.0, grayscale=True).to_numpy().reshape(792, 612) < 128
        assert not dark[:, :34].any()
        assert not dark[:, -34:].any()
        assert not dark[:20].any()
        assert not dark[-20:].any()
    document.close()
    assert f"End of certificate {issued.number}" in re.sub(r"\s+", " ", pages_of(pdf)[-1])


def test_certificate_ends_with_its_end_mark(issued, pdf) -> None:
    mark = f"End of certificate {issued.number}"
    found = [mark in re.sub(r"\s+", " ", page) for page in pages_of(pdf)]
    assert found == [False] * (len(found) - 1) + [True]


@pytest.mark.parametrize(
    ("item", "says"),
    [
        ("a title", "Titrant standardization certificate (in-house)"),
        ("b laboratory", "Tarnbeck Waterworks, Laboratory, 4 Filter Lane, Tarnbeck"),
        ("c place", "performed at its own address"),
        ("d number", "Certificate TL-2026-0005"),
        ("e customer", "Prepared for the laboratory itself"),
        ("f method", "(recipe NaOH 0.1 against KHP, version 1)"),
        ("g item", "lot NaOH 0.1 mol/L, 2026-11-19, code "),
        ("h made", "made by Imke Thorvald, 19 Nov 2026"),
        ("i performed", "27 Nov 2026, 14:10 to 15:22 (Europe/Zurich, UTC+01:00)"),
        ("j issued", "Issued 27 Nov 2026, 18:00 (Europe/Zurich, UTC+01:00)"),
        ("l relates", "The result relates only to lot NaOH 0.1 mol/L, 2026-11-19."),
        ("n deviations", "20.26 mL (Bashir Oduya, 27 Nov 2026, 14:46) struck through"),
        ("o authorized", "Ottilie Renn, countersigner Meaning: countersigned"),
        ("p outside", "No result from outside the laboratory enters"),
        ("note", "To be reproduced only in full."),
        ("7.8.4 conditions", "Air temperature 21.4 °C"),
        ("7.8.4 end point", "End point visual, phenolphthalein"),
        ("7.8.4 traceability", "Traceability: the value rests on the standard"),
        ("7.8.6 rule", "Decision rule of the findings"),
        ("7.8.8 replaces", "This certificate replaces TL-2026-0004"),
        ("7.8.8 reason", "The lot was standardized anew on bench sheet S-2026-0005."),
        ("validity", "11 Dec 2026, set by: interval of the recipe, 14 days after measuring"),
        ("coverage", "with k = 2.0 for a coverage of 95 %"),
        ("root", "KHP, lot PH-2291"),
        ("accepted", "accepted by Ottilie Renn"),
        ("anchor", "SHA-256, trail, act"),
    ],
)
def test_certificate_carries(text, item, says) -> None:
    """Items a to p of ISO/IEC 17025, 7.8.2.1 (k, sampling, is not done), 7.8.4, 7.8.6, 7.8.8."""
    assert says in text, item


def test_certificate_carries_result_change_and_largest_part(laboratory, issued, text) -> None:
    """Items m of 7.8.2.1 and 7.8.8, and the budget, as the documents state them."""
    result = issued.document["result"]
    value, U = result["concentration"]["reported"].split(" mol/L")[0].split(" ± ")
    assert f"{value} ± {U} mol/L" in text
    before = laboratory.issued(issued.document["replaces"]).document["result"]
    assert before["concentration"]["reported"] in text
    largest = max(result["budget"], key=lambda one: one["share_percent"])
    assert f"The largest part is {largest['source']}" in text


def test_certificate_claims_no_accreditation(text) -> None:
    for claim in ("CRM", "reference material", "accredit", "certified to", "17034"):
        assert claim.lower() not in text.lower()


def test_certificate_prints_every_correction_finding_and_root(issued, text) -> None:
    stated = [one["reason"] for one in issued.document["corrections"]]
    stated += [one["says"] for one in issued.document["findings"]]
    stated += [one["basis"] for one in issued.document["findings"]]
    for one in issued.document["traceability"]:
        stated += [one["name"], one["certificate_number"], one["issuer"]]
    stated += [one["signed_digest"] for one in issued.document["signatures"]]
    stated += [one["source"] for one in issued.document["result"]["budget"]]
    flat = text.replace(" ", "")
    assert [one for one in stated if one.replace(" ", "") not in flat] == []


def test_certificate_of_a_monte_carlo_result_prints_its_interval_and_no_u(laboratory) -> None:
    first = laboratory.issued("TL-2026-0001")
    reported = first.document["result"]["concentration"]["reported"]
    value, _, interval = reported.partition(" mol/L, 95 % interval ")
    flat = text_of(certificate_pdf(first))
    assert f"{value} mol/L Amount concentration" in flat
    assert f"Coverage interval of 95 %: {interval}" in flat
    assert "Expanded uncertainty U" not in flat


def test_certificate_made_by_many_at_once_is_each_its_own(issued, replaced) -> None:
    wanted = {one.number: certificate_pdf(one) for one in (issued, replaced)}
    with ThreadPoolExecutor(6) as pool:
        made = list(pool.map(certificate_pdf, [issued, replaced] * 6))
    assert made == [wanted[issued.number], wanted[replaced.number]] * 6


def test_certificate_that_was_replaced_says_so_on_every_page(replaced) -> None:
    for page in pages_of(certificate_pdf(replaced)):
        flat = re.sub(r"\s+", " ", page)
        assert "REPLACED. Replaced by certificate TL-2026-0005." in flat
        assert "State at printing, 1 Dec 2026, 14:05 (Europe/Zurich, UTC+01:00)" in flat


def test_certificate_that_stands_bears_no_state(text) -> None:
    assert "REPLACED" not in text
    assert "PULLED" not in text
    assert "ALTERED" not in text


def test_certificate_of_a_pulled_lot_says_so_and_why(issued) -> None:
    says = "Pulled 1 Dec 2026 by Jonas Halework and Ottilie Renn: cloudy."
    pulled = replace(issued, state="pulled", state_says=says)
    for page in pages_of(certificate_pdf(pulled)):
        flat = re.sub(r"\s+", " ", page)
        assert f"PULLED. The lot is pulled: do not use it. {says}" in flat


def test_certificate_whose_text_was_changed_says_altered_on_every_page(issued) -> None:
    for page in pages_of(certificate_pdf(replace(issued, holds=False))):
        assert "ALTERED" in page


def test_certificate_signature_that_does_not_hold_is_called_out(issued) -> None:
    broken = text_of(certificate_pdf(replace(issued, signatures_hold=(True, False))))
    assert broken.count("This signature does not hold") == 1


def test_certificate_without_a_second_person_says_not_independently_reviewed(issued, text) -> None:
    alone = changed(issued, independently_reviewed=False)
    assert "Not independently reviewed." in text_of(certificate_pdf(alone))
    assert "Not independently reviewed" not in text


MARKUP = [
    '#panic("stop")',
    '#read("/etc/passwd")',
    "$x^2$ *bold* _it_ `raw` @ref <label> \\ // /* = -",
    "<script>alert(1)</script> {{7*7}} {% x %}",
    "]] }} ) \" ' \\u{41}",
]


@pytest.mark.parametrize("markup", MARKUP)
def test_certificate_shows_markup_in_names_as_it_was_typed(issued, markup) -> None:
    laboratory = {**issued.document["laboratory"], "name": markup}
    names = changed(issued, laboratory=laboratory, valid_for=markup)
    flat = text_of(certificate_pdf(names)).replace(" ", "")
    assert flat.count(markup.replace(" ", "")) >= 2


def test_certificate_spells_letters_that_no_font_has(issued) -> None:
    """A private-use letter is in no font; the attached document keeps it as it is."""
    lot = {**issued.document["lot"], "name": "Lot \ue123\x07 Ω"}
    odd = changed(issued, lot=lot)
    made = certificate_pdf(odd)
    assert "Lot ⟨U+E123⟩⟨U+0007⟩ Ω" in text_of(made)
    attached = opened(made).attachments["TL-2026-0005.json"][0]
    assert json.loads(attached)["lot"]["name"] == "Lot \ue123\x07 Ω"


@pytest.mark.parametrize("remark", ["x" * 10_000, "word " * 2_000])
def test_certificate_prints_a_remark_of_ten_thousand_characters_whole(issued, remark) -> None:
    entry = {**issued.document["entries"][0], "slot": "remark", "text": remark, "reason": None}
    signatures = [{**one, "remark": remark} for one in issued.document["signatures"]]
    long = changed(issued, entries=[*issued.document["entries"], entry], signatures=signatures)
    flat = text_of(certificate_pdf(long)).replace(" ", "")
    letter = remark[0]
    assert flat.count(letter) >= 3 * remark.count(letter)


def test_certificate_is_the_same_bytes_each_time(issued, jws, pdf) -> None:
    assert certificate_pdf(issued, jws=jws) == pdf


def test_certificate_pages_as_pictures_keep_within_their_margins(issued, pdf) -> None:
    """Drawn by PDFium: ink on every page, none in the outer 12 mm at left and right."""
    document = pypdfium2.PdfDocument(pdf)
    for page in document:
        grey = page.render(scale=1.0, grayscale=True).to_numpy().reshape(842, -1)
        dark = grey < 128
        assert dark.sum() > 2_000
        edge = round(12 / 25.4 * 72)
        assert not dark[:, :edge].any()
        assert not dark[:, -edge:].any()
    document.close()
    assert len(certificate_pictures(issued, dots_per_inch=50)) == len(opened(pdf).pages)


def test_certificate_in_grey_keeps_its_letters_apart_from_the_paper(pdf) -> None:
    """The palest letters of the pages, drawn in grey by PDFium, are darker than half."""
    document = pypdfium2.PdfDocument(pdf)
    page = document[0].render(scale=3.0, grayscale=True).to_numpy().reshape(842 * 3 - 0, -1)
    label = page[round(148 / 297 * page.shape[0]) :, : page.shape[1] // 6]
    assert label.min() < 128
    document.close()
