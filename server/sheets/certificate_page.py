"""A certificate: the issued document as it reads, and its state today."""

import json
from collections.abc import Iterator, Mapping
from datetime import datetime
from typing import Any

from sqlalchemy.orm import Session

from server.chemistry.substances import name_of
from server.lab.actor import Actor
from server.lab.canonical import digest
from server.lab.refusal import NotFound
from server.records.queries.list_certificates import (
    KeptCertificate,
    anchor_hash,
    certificate_by_number,
)
from server.records.queries.list_sheets import snapshots_of
from server.records.queries.list_shelf import last_pull
from server.records.queries.list_trail import issue_noted
from server.records.queries.load_papers import load_laboratory_fact
from server.records.queries.load_sheet import load_sheet_facts
from server.sheets.bench import SignatureView
from server.sheets.certificate import CertificateChanges, CertificateFile, CertificatePage
from server.sheets.parts import outcome
from server.sheets.parts.certificate_words import (
    CUSTOMER,
    end_point_words,
    item_words,
    statement_lines,
)
from server.sheets.parts.doors import need_reader
from server.sheets.parts.history import state_of_certificate
from server.sheets.parts.integrity import altered_says
from server.sheets.parts.replacement import changed_lines, why_replaced
from server.sheets.parts.roots import certificate_roots, root_urls
from server.sheets.parts.shelf_state import nominal_words
from server.sheets.parts.signed import signature_views
from server.sheets.parts.telling import (
    listed,
    moment_words,
    signed_words,
    typed_day_words,
    unit_words,
)


def open_certificate(
    session: Session, number: str, *, actor: Actor | None, now: datetime
) -> CertificatePage:
    """Return a certificate for reading and print.

    Raises:
        NotFound: there is no certificate of this number.
        NotSignedIn: a visitor; people's names stand on it.
    """
    del now
    need_reader(actor)
    kept = _kept(session, number)
    document = kept.document
    result, lot, zone = document["result"], document["lot"], document["laboratory"]["zone"]
    shown = outcome.printed(result)
    has_dcc = bool(load_laboratory_fact(session).settings.get("country"))
    return CertificatePage(
        number=kept.row.number,
        state=state_of_certificate(kept),
        state_says=_state_says(session, kept, zone),
        replaced_by=kept.replaced_by,
        replaces=document["replaces"],
        title=document["title"],
        laboratory=document["laboratory"]["name"],
        address=document["laboratory"]["address"],
        titrant=name_of(lot["titrant"]).capitalize(),
        nominal=nominal_words(lot["nominal"]),
        lot_code=lot["code"],
        lot_name=lot["name"],
        item=item_words(lot),
        customer=CUSTOMER,
        end_point=end_point_words(document["end_point"]),
        sheet_number=document["sheet"]["number"],
        value=shown.value,
        uncertainty=shown.uncertainty,
        unit=shown.unit,
        k=shown.k,
        beside=shown.beside,
        coverage=shown.coverage,
        factor=shown.factor,
        temperature=f"at {result['concentration']['temperature_C']} °C",
        valid_for=document["valid_for"],
        valid_until=typed_day_words(document["validity"]["last_day"]),
        valid_until_rule=document["validity"]["rule"],
        measured_on=_measured(document["measured"]),
        issued_on=signed_words(datetime.fromisoformat(document["issued_at"]), zone),
        method=_method(document["recipe"]),
        traceability=certificate_roots(document),
        findings=outcome.finding_views(document["findings"]),
        corrections=tuple(_corrections(document, zone)),
        remarks=tuple(_remarks(document, zone)),
        replicates=outcome.replicate_rows(result),
        budget=outcome.budget_rows(result, root_urls(document["traceability"])),
        bars=outcome.bars(result),
        dots=outcome.dots(result),
        signatures=_signatures(session, kept),
        calculation=outcome.calculation(result),
        input_digest=document["input_digest"],
        document_digest=kept.row.document_digest,
        document_holds=document_holds(session, kept),
        altered=altered_says(session, kept.row.sheet_id),
        trail_anchor=f"act {kept.row.trail_seq}, {kept.row.trail_hash}",
        statements=tuple(statement_lines(document)),
        files=tuple(_files(kept.row.number, has_dcc=has_dcc)),
        no_dcc="" if has_dcc else "No DCC: the laboratory's country is not set.",
        changes=_changes(session, document),
        reviewed=document["independently_reviewed"],
    )


def open_certificate_document(
    session: Session, number: str, *, actor: Actor | None, now: datetime
) -> dict[str, Any]:
    """Return the issued document with its state today, digest, and whether that holds.

    Raises:
        NotFound: there is no certificate of this number.
        NotSignedIn: a visitor; people's names stand on it.
    """
    need_reader(actor)
    kept = _kept(session, number)
    return {
        "document": kept.document,
        "state": state_of_certificate(kept),
        "state_says": _state_says(session, kept, kept.document["laboratory"]["zone"]),
        "replaced_by": kept.replaced_by,
        "document_digest": kept.row.document_digest,
        "document_holds": document_holds(session, kept),
        "trail": {"seq": kept.row.trail_seq, "hash": kept.row.trail_hash},
        "as_of": now.isoformat(),
    }


def document_holds(session: Session, kept: KeptCertificate) -> bool:
    """Say whether the text is the one that was issued: its digest, the trail's, and the anchor."""
    made_anew = digest(kept.row.document)
    noted = issue_noted(session, kept.row.id)
    return (
        made_anew == kept.row.document_digest
        and noted is not None
        and json.loads(noted).get("document_digest") == made_anew
        and anchor_hash(session, kept.row.trail_seq) == kept.row.trail_hash
    )


def _kept(session: Session, number: str) -> KeptCertificate:
    kept = certificate_by_number(session, number)
    if kept is None:
        raise NotFound(f"There is no certificate {number[:40]}.", field="number")
    return kept


def _changes(session: Session, document: Mapping[str, Any]) -> CertificateChanges | None:
    """Return what the certificate says otherwise than the one it replaces, None where none."""
    before = certificate_by_number(session, document["replaces"]) if document["replaces"] else None
    if before is None:
        return None
    return CertificateChanges(
        reason=why_replaced(document, before.document),
        lines=tuple(changed_lines(before.document, document)),
    )


def _state_says(session: Session, kept: KeptCertificate, zone: str) -> str:
    """Return since when, and where it was pulled why, a certificate stands no more."""
    if kept.replaced_by is not None:
        later = certificate_by_number(session, kept.replaced_by)
        return f"Since {moment_words(later.row.issued_at, zone)}." if later else ""
    pull = last_pull(session, kept.row.lot_id) if kept.pulled else None
    if pull is None or pull.confirmed_at is None:
        return ""
    return f"Since {moment_words(pull.confirmed_at, zone)}: {pull.reason}"


def _files(number: str, *, has_dcc: bool) -> Iterator[CertificateFile]:
    at = f"/certificates/{number}"
    yield CertificateFile(f"{at}.pdf", "PDF", "for print and archive, the signed document inside")
    yield CertificateFile(f"{at}.jws", "JWS", "the document signed by the laboratory (RFC 7515)")
    yield CertificateFile(f"{at}.json", "JSON", "the document; its SHA-256 is the digest above")
    if has_dcc:
        yield CertificateFile(f"{at}.dcc.xml", "DCC", "digital calibration certificate, XML 3.3.0")
    yield CertificateFile(
        f"{at}.bench-record.json",
        "bench record",
        "what the number is computed from, to do it again",
    )


def _signatures(session: Session, kept: KeptCertificate) -> tuple[SignatureView, ...]:
    """Return the two signatures that the document names, checked against the sheet as it stands."""
    facts = load_sheet_facts(session, kept.row.sheet_id)
    views = signature_views(facts, snapshots_of(session, facts.id))
    by_id = dict(zip((one.id for one in facts.signatures), views, strict=True))
    return tuple(by_id[one["id"]] for one in kept.document["signatures"] if one["id"] in by_id)


def _measured(measured: Mapping[str, Any]) -> str:
    by = f" by {listed(measured['by'])}" if measured["by"] else ""
    return f"{typed_day_words(measured['day'])}{by}"


def _method(recipe: Mapping[str, Any]) -> str:
    return f"{recipe['title']} (recipe {recipe['name']}, version {recipe['version']})"


def _corrections(document: Mapping[str, Any], zone: str) -> Iterator[str]:
    for one in document["corrections"]:
        where = f"Replicate {one['replicate']}" if one["replicate"] else "Sheet"
        unit = f" {unit_words(one['unit'])}" if one["unit"] else ""
        now = f"{one['now']}{unit}" if one["now"] else "nothing"
        at = moment_words(datetime.fromisoformat(one["at"]), zone)
        yield (
            f"{where}, {one['label']}: {one['was']}{unit} ({one['was_by']}) struck through, {now} "
            f"written by {one['by']}, {at}: {one['reason']}"
        )


def _remarks(document: Mapping[str, Any], zone: str) -> Iterator[str]:
    """Yield what was left out, and the remarks written on the sheet."""
    for one in document["replicates_left_out"]:
        at = moment_words(datetime.fromisoformat(one["at"]), zone)
        yield (
            f"Replicate {one['replicate']} left out of the mean by {one['by']}, {at}: "
            f"{one['criterion']}: {one['reason']}"
        )
    for one in document["entries"]:
        if one["slot"] == "remark":
            where = f"Replicate {one['replicate']}" if one["replicate"] else "Sheet"
            yield f"{where}: {one['text']} ({one['by']})"
