"""A certificate: the issued document, its state today, and whether it holds."""

import json

import pytest
import sqlalchemy as sa

from server.lab.canonical import canonical, digest
from server.lab.refusal import NotFound, NotSignedIn
from server.records.tables.bench import Certificate, Signature
from server.sheets.certificate_page import open_certificate, open_certificate_document


def document_of(demo, number):
    return demo.read(open_certificate_document, number, who="bashir")["document"]


def test_certificate_prints_what_its_document_says(demo) -> None:
    page, document = (
        demo.read(open_certificate, "TL-2026-0005", who="bashir"),
        document_of(demo, "TL-2026-0005"),
    )
    shown = f"{page.value} ± {page.uncertainty} {page.unit} (k = {page.k})"
    assert shown == document["result"]["concentration"]["reported"]
    assert page.laboratory == document["laboratory"]["name"]
    assert page.statements[: len(document["statements"])] == tuple(document["statements"])
    assert page.valid_for == "visual, phenolphthalein"
    assert page.measured_on == "27 Nov 2026 by Bashir Oduya"
    assert page.issued_on == "27 Nov 2026, 18:00 (Europe/Zurich)"
    assert (page.valid_until, page.temperature) == ("11 Dec 2026", "at 20 °C")


def test_certificate_that_was_replaced_says_by_which(demo) -> None:
    old = demo.read(open_certificate, "TL-2026-0004", who="bashir")
    new = demo.read(open_certificate, "TL-2026-0005", who="bashir")
    assert (old.state, old.replaced_by) == ("replaced", "TL-2026-0005")
    assert (new.state, new.replaces) == ("standing", "TL-2026-0004")


def test_certificate_footnotes_every_correction(demo) -> None:
    (line,) = demo.read(open_certificate, "TL-2026-0005", who="bashir").corrections
    assert line.startswith("Replicate 3, Burette, end: ")
    assert line.endswith("misread by a whole millilitre")


def test_certificate_shows_a_replicate_left_out_and_why(demo) -> None:
    page = demo.read(open_certificate, "TL-2026-0003", who="bashir")
    left_out = [row for row in page.replicates if row.excluded]
    assert [row.label for row in left_out] == ["4"]
    assert left_out[0].value
    assert page.remarks[0].startswith("Replicate 4 left out of the mean by Imke Thorvald")
    assert "excluded" in {one.name for one in page.findings}


def test_certificate_signatures_are_checked_again(demo) -> None:
    page = demo.read(open_certificate, "TL-2026-0005", who="bashir")
    assert [(one.printed_name, one.meaning, one.holds) for one in page.signatures] == [
        ("Bashir Oduya", "measured", True),
        ("Ottilie Renn", "countersigned", True),
    ]
    assert {one.accepted_by for one in page.findings if one.verdict == "fails"} == {"Ottilie Renn"}


def test_certificate_document_digest_is_that_of_its_canonical_text(demo) -> None:
    found = demo.read(open_certificate_document, "TL-2026-0005", who="bashir")
    assert digest(canonical(found["document"])) == found["document_digest"]
    assert found["document_holds"]
    assert found["state"] == "standing"


@pytest.mark.parametrize("also_digest", [False, True])
def test_certificate_whose_text_was_changed_does_not_hold(own_demo, also_digest) -> None:
    own_demo.without_triggers()

    def tamper(session):
        row = session.scalar(sa.select(Certificate).where(Certificate.number == "TL-2026-0005"))
        document = json.loads(row.document)
        document["result"]["concentration"]["value"] *= 1.001
        row.document = canonical(document)
        if also_digest:
            row.document_digest = digest(row.document)

    own_demo.write(tamper)
    assert not own_demo.read(open_certificate, "TL-2026-0005", who="bashir").document_holds


def test_certificate_signature_of_another_person_does_not_hold(own_demo) -> None:
    own_demo.without_triggers()
    imke = own_demo.people["imke"].person_id
    measured = sa.update(Signature).where(Signature.meaning == "measured")
    own_demo.write(lambda s: s.execute(measured.values(person_id=imke)))
    page = own_demo.read(open_certificate, "TL-2026-0005", who="bashir")
    assert [one.holds for one in page.signatures] == [False, True]


@pytest.mark.parametrize("opened", [open_certificate, open_certificate_document])
def test_certificate_for_a_visitor_asks_to_sign_in(demo, opened) -> None:
    with pytest.raises(NotSignedIn):
        demo.read(opened, "TL-2026-0005", who=None)


def test_certificate_of_an_unknown_number_is_not_found(demo) -> None:
    with pytest.raises(NotFound, match="TL-2026-9999"):
        demo.read(open_certificate, "TL-2026-9999", who="bashir")
