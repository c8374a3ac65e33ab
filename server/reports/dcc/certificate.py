"""The certificate as a DCC 3.3.0: who, what, which result, with what.

The schema itself is not part of the program; its order of elements is kept here and checked in the
tests. A DCC speaks of calibrations: the item is the titrant lot, its calibration the
standardization.
"""

import base64
import re
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from datetime import datetime
from typing import Any
from xml.etree.ElementTree import Element, indent, register_namespace, tostring

from server.chemistry.substances import name_of
from server.lab.canonical import canonical, digest
from server.lab.refusal import Unacceptable
from server.lab.validity import local_day
from server.reports.dcc import elements as el
from server.reports.dcc.results import add_results
from server.reports.issued import Issued

VERSION = "3.3.0"
_SCHEMA = f"{el.DCC} {el.DCC}/v{VERSION}/dcc.xsd"
_XSI = "http://www.w3.org/2001/XMLSchema-instance"
_COUNTRY = re.compile(r"[A-Z]{2}", re.ASCII)
_RELEASE = re.compile(r"\d{1,3}(\.\d{1,3}){0,3}", re.ASCII)
_ROLES = {"measured": "analyst", "countersigned": "countersigner"}


@dataclass(frozen=True, slots=True)
class About:
    """What a DCC must say that the certificate does not.

    ``country`` is the laboratory's, two letters of ISO 3166-1; ``release`` the program's number.
    ``paper_hashes`` maps calibrations and standard lots, by id, to the SHA-256 of their original
    files. ``pdf`` is the printed certificate, where it shall travel inside.
    """

    country: str
    release: str
    paper_hashes: Mapping[str, str] = field(default_factory=dict)
    pdf: bytes | None = field(default=None, repr=False)


def dcc_xml(issued: Issued, about: About) -> bytes:
    """Return the certificate as a DCC in UTF-8.

    Raises:
        Unacceptable: the country is none, or the certificate does not stand as it was issued.
    """
    if not _COUNTRY.fullmatch(about.country):
        says = "country must be two capital letters of ISO 3166-1."
        raise Unacceptable(says, field="country", example="CH")
    if not issued.holds:
        says = f"Certificate {issued.number} is not the text that was issued: it is not exported."
        raise Unacceptable(says, field="number")
    for prefix, space in (("dcc", el.DCC), ("si", el.SI), ("xsi", _XSI)):
        register_namespace(prefix, space)
    root = Element(f"{{{el.DCC}}}digitalCalibrationCertificate", {"schemaVersion": VERSION})
    root.set(f"{{{_XSI}}}schemaLocation", _SCHEMA)
    _administrative(root, issued, about)
    add_results(root, issued.document, about.paper_hashes)
    if about.pdf is not None:
        _printed(root, issued, about.pdf)
    indent(root)
    text: bytes = tostring(root, encoding="utf-8", xml_declaration=True)
    return text


def _administrative(root: Element, issued: Issued, about: About) -> None:
    document = issued.document
    data = el.dcc(root, "administrativeData")
    software = el.dcc(el.dcc(data, "dccSoftware"), "software")
    el.words(software, "name", "Titrant Ledger")
    el.dcc(software, "release", _release(about.release))
    el.dcc(software, "type", "application")
    _core(data, issued, about)
    _item(data, document)
    laboratory = el.dcc(data, "calibrationLaboratory")
    _contact(laboratory, "contact", document, about)
    _people(data, document)
    _contact(data, "customer", document, about)
    statements = el.dcc(data, "statements")
    for name, says, day in _statements(issued):
        one = el.dcc(statements, "statement")
        el.words(one, "name", name)
        el.words(one, "declaration", says)
        if day:
            el.dcc(one, "date", day)


def _core(data: Element, issued: Issued, about: About) -> None:
    document, zone = issued.document, issued.document["laboratory"]["zone"]
    core = el.dcc(data, "coreData")
    el.dcc(core, "countryCodeISO3166_1", about.country)
    el.dcc(core, "usedLangCodeISO639_1", el.LANGUAGE)
    el.dcc(core, "mandatoryLangCodeISO639_1", el.LANGUAGE)
    el.dcc(core, "uniqueIdentifier", issued.number)
    _identification(el.dcc(core, "identifications"), document["sheet"]["number"], "bench sheet")
    el.dcc(core, "beginPerformanceDate", _day(document["measured"]["from"], zone))
    el.dcc(core, "endPerformanceDate", _day(document["measured"]["to"], zone))
    el.dcc(core, "performanceLocation", "laboratory")
    el.dcc(core, "issueDate", _day(document["issued_at"], zone))
    if document["replaces"]:
        amended = el.dcc(core, "reportAmendedSubstituted")
        el.dcc(amended, "typeOfChange", "substituted")
        el.dcc(amended, "replacedUniqueIdentifier", document["replaces"])
        if issued.previous is not None:
            el.hashed(
                core,
                "previousReport",
                says="certificate that this one replaces",
                identifier=document["replaces"],
                value=digest(canonical(issued.previous)),
                about="Of the replaced certificate's document in its canonical JSON text.",
            )


def _item(data: Element, document: Mapping[str, Any]) -> None:
    lot = document["lot"]
    item = el.dcc(el.dcc(data, "items"), "item")
    el.words(item, "name", f"{name_of(lot['titrant'])}, {lot['name']}")
    made = f", {lot['prepared_on']}" if lot["prepared_on"] else ""
    el.words(item, "description", f"in {lot['medium']}; made by {lot['made_by']}{made}")
    _identification(el.dcc(item, "identifications"), lot["code"], "code of the lot")
    quantities = el.dcc(item, "itemQuantities")
    nominal = el.dcc(quantities, "itemQuantity", refType="basic_nominalValue")
    el.words(nominal, "name", "nominal concentration")
    if el.is_decimal(lot["nominal"]):
        el.real(nominal, lot["nominal"], document["result"]["concentration"]["unit"])
    else:
        el.words(nominal, "noQuantity", lot["nominal"])


def _people(data: Element, document: Mapping[str, Any]) -> None:
    people = el.dcc(data, "respPersons")
    for one in document["signatures"]:
        person = el.dcc(people, "respPerson")
        el.words(el.dcc(person, "person"), "name", one["printed_name"])
        says = f"signed “{one['meaning']}” at {one['at']} ({one['zone']})"
        el.words(person, "description", says)
        el.dcc(person, "role", _ROLES.get(one["meaning"], one["meaning"]))
        el.dcc(person, "mainSigner", "true" if one["meaning"] == "countersigned" else "false")


def _statements(issued: Issued) -> Iterator[tuple[str, str, str | None]]:
    document = issued.document
    yield from (("statement", says, None) for says in document["statements"])
    yield "valid until", document["validity"]["rule"], document["validity"]["last_day"]
    yield "valid for", document["valid_for"], None
    if not issued.stands:
        by = f" by {issued.replaced_by}" if issued.replaced_by else ""
        says = f"{issued.state}{by}. {issued.state_says} Do not use this result.".replace("  ", " ")
        yield "state", says, _day(issued.as_of.isoformat(), document["laboratory"]["zone"])
    anchor = f"anchored to act {issued.anchor.seq}, {issued.anchor.hash}"
    yield "trail", f"{anchor}; SHA-256 of the document {issued.document_digest}", None


def _contact(parent: Element, name: str, document: Mapping[str, Any], about: About) -> None:
    made = el.dcc(parent, name)
    el.words(made, "name", document["laboratory"]["name"])
    location = el.dcc(made, "location")
    el.dcc(location, "countryCode", about.country)
    el.words(location, "further", document["laboratory"]["address"])


def _identification(parent: Element, value: str, name: str) -> None:
    one = el.dcc(parent, "identification")
    el.dcc(one, "issuer", "calibrationLaboratory")
    el.dcc(one, "value", value)
    el.words(one, "name", name)


def _printed(root: Element, issued: Issued, pdf: bytes) -> None:
    made = el.dcc(root, "document")
    el.words(made, "name", "the printed certificate")
    el.dcc(made, "fileName", f"{issued.number}.pdf")
    el.dcc(made, "mimeType", "application/pdf")
    el.dcc(made, "dataBase64", base64.b64encode(pdf).decode("ascii"))


def _release(release: str) -> str:
    """Return the program's release as DCC tools read it: ``v1.2.3``."""
    found = _RELEASE.match(release)
    return f"v{found.group()}" if found else "v0"


def _day(at: str, zone: str) -> str:
    return local_day(datetime.fromisoformat(at), zone).isoformat()
