"""Gathering all of a certificate from the record: document, state, snapshot, papers."""

from collections.abc import Iterable, Iterator
from dataclasses import dataclass, replace
from datetime import datetime
from typing import Any

from sqlalchemy.orm import Session

from server.lab.actor import Actor
from server.lab.canonical import digest
from server.lab.own_site import PAPERS
from server.records.queries.list_certificates import certificate_by_number
from server.records.queries.list_sheets import snapshots_of
from server.records.queries.load_papers import load_laboratory_fact
from server.records.tables.stores import Calibration, File, StandardLot
from server.reports.issued import Issued, issued_from
from server.sheets.certificate_page import open_certificate, open_certificate_document


@dataclass(frozen=True, slots=True)
class Paper:
    """A calibration or standard lot that has a file, and how a person names it."""

    thing_id: str
    name: str
    file: File


@dataclass(frozen=True, slots=True)
class GatheredCertificate:
    """A certificate with what its files say besides.

    ``country`` is the laboratory's, empty where none is set; ``paper_hashes`` maps calibrations
    and standard lots, by id, to the SHA-256 of their files.
    """

    issued: Issued
    country: str
    paper_hashes: dict[str, str]


def gather_certificate(
    session: Session, number: str, *, actor: Actor | None, now: datetime
) -> GatheredCertificate:
    """Return a certificate with its state today, ready to leave the laboratory.

    Raises:
        NotFound: there is no certificate of this number.
        NotSignedIn: a visitor; people's names stand on it.
    """
    issued = gather_issued(session, number, actor=actor, now=now)
    replaces = issued.document["replaces"]
    before = certificate_by_number(session, replaces) if replaces else None
    if before is not None:
        issued = replace(issued, previous=before.document)
    settings = load_laboratory_fact(session).settings
    papers = papers_of(session, [issued])
    return GatheredCertificate(
        issued=issued,
        country=str(settings.get("country") or ""),
        paper_hashes={paper.thing_id: paper.file.sha256 for paper in papers},
    )


def gather_issued(session: Session, number: str, *, actor: Actor | None, now: datetime) -> Issued:
    """Return an issued certificate without the one that it replaces.

    The address of its QR code is the laboratory's own; without one it has no QR code.
    """
    page = open_certificate(session, number, actor=actor, now=now)
    found = open_certificate_document(session, number, actor=actor, now=now)
    kept = snapshots_of(session, found["document"]["sheet"]["id"])
    wanted = found["document"]["snapshot_digest"]
    settings = load_laboratory_fact(session).settings
    base_url = settings.get("base_url")
    return issued_from(
        found,
        signatures_hold=tuple(one.holds for one in page.signatures),
        snapshot=next((text for text in kept.values() if digest(text) == wanted), None),
        url=f"{base_url}/certificates/{number}" if base_url else None,
        paper=str(settings.get("paper") or PAPERS[0]),
    )


def papers_of(session: Session, certificates: Iterable[Issued]) -> Iterator[Paper]:
    """Yield the papers with files of all roots of certificates, each once."""
    seen: set[str] = set()
    for certificate in certificates:
        for root in certificate.document["traceability"]:
            thing_id = root["calibration_id"] or root["id"]
            if thing_id in seen:
                continue
            seen.add(thing_id)
            file = _file_of(session, root, thing_id)
            if file is not None:
                yield Paper(thing_id, f"{root['name']}, {root['certificate_number']}", file)


def _file_of(session: Session, root: dict[str, Any], thing_id: str) -> File | None:
    row: Calibration | StandardLot | None = (
        session.get(Calibration, thing_id)
        if root["calibration_id"]
        else session.get(StandardLot, thing_id)
    )
    return session.get(File, row.file_id) if row is not None and row.file_id else None
