"""A certificate's files: for each kind its name, media type and bytes."""

import json
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field

from server.credentials.signing_keys import SigningKeys
from server.lab.refusal import NotFound, Unacceptable
from server.reports.certificate.gathering import GatheredCertificate
from server.reports.certificate.pdf import certificate_pdf
from server.reports.dcc.certificate import About, dcc_xml
from server.reports.issued import Issued
from server.reports.signed_certificate import sign_certificate


@dataclass(frozen=True, slots=True)
class FileOut:
    """A file as somebody receives it; ``state`` is that of the certificate, in words."""

    name: str
    media_type: str
    content: bytes = field(repr=False)
    state: str


@dataclass(frozen=True, slots=True)
class Pen:
    """With what files are made: the laboratory's keys, and the program's release."""

    keys: SigningKeys
    release: str


Maker = Callable[[GatheredCertificate, Pen], bytes]


def certificate_file(gathered: GatheredCertificate, kind: str, pen: Pen) -> FileOut:
    """Return a file of a certificate; the same certificate in the same state gives the same bytes.

    Raises:
        KeyError: a kind that is none.
        Unacceptable: the text is not the one that was issued, and so is not signed or exported; no
            country for a DCC.
        NotFound: the evaluation behind it is not kept.
    """
    media_type, make = KINDS[kind]
    issued = gathered.issued
    return FileOut(f"{issued.number}.{kind}", media_type, make(gathered, pen), _state(issued))


def _pdf(gathered: GatheredCertificate, pen: Pen) -> bytes:
    issued = gathered.issued
    jws = sign_certificate(issued, pen.keys.current) if issued.holds else None
    return certificate_pdf(issued, jws=jws)


def _document(gathered: GatheredCertificate, pen: Pen) -> bytes:
    del pen
    return gathered.issued.text.encode()


def _signed(gathered: GatheredCertificate, pen: Pen) -> bytes:
    issued = gathered.issued
    if not issued.holds:
        says = f"Certificate {issued.number} is not the text that was issued: it is not signed."
        raise Unacceptable(says, field="number")
    return sign_certificate(issued, pen.keys.current).encode()


def _dcc(gathered: GatheredCertificate, pen: Pen) -> bytes:
    if not gathered.country:
        says = "No DCC can be made: a steward sets the laboratory's country first."
        raise Unacceptable(says, field="country", example="CH")
    about = About(gathered.country, pen.release, gathered.paper_hashes)
    return dcc_xml(gathered.issued, about)


def _bench_record(gathered: GatheredCertificate, pen: Pen) -> bytes:
    del pen
    evaluation = gathered.issued.evaluation_document()
    if evaluation is None:
        raise NotFound("The evaluation behind this certificate is not kept.", field="number")
    return (json.dumps(evaluation["record"], ensure_ascii=False, indent=1) + "\n").encode()


def _state(issued: Issued) -> str:
    if not issued.holds:
        return "altered"
    return f"replaced by {issued.replaced_by}" if issued.replaced_by else issued.state


#: What stands behind a certificate's number in a file's address.
KINDS: Mapping[str, tuple[str, Maker]] = {
    "pdf": ("application/pdf", _pdf),
    "json": ("application/json", _document),
    "jws": ("application/jose", _signed),
    "dcc.xml": ("application/xml", _dcc),
    "bench-record.json": ("application/json", _bench_record),
}
