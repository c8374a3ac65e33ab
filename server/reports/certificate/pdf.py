"""The certificate as PDF/A-3 and PDF/UA-1, with the document and its signature attached."""

from datetime import datetime

from server.reports.certificate.told import certificate_told
from server.reports.issued import Issued
from server.reports.qr_code import qr_squares
from server.reports.typesetting import set_pdf, set_pictures

_PAGE = "certificate"


def certificate_pdf(issued: Issued, *, jws: str | None = None) -> bytes:
    """Return the printed certificate.

    The file attaches the issued document as it is kept (``NUMBER.json``) and, where ``jws`` is
    given, the signed certificate (``NUMBER.jws``). The same input gives the same bytes.
    """
    files = {"document": issued.text, "jws": jws or ""}
    return set_pdf(_PAGE, _told(issued), made_at=_made_at(issued), files=files)


def certificate_pictures(issued: Issued, *, dots_per_inch: float = 110) -> list[bytes]:
    """Return the printed certificate's pages as PNG pictures."""
    return set_pictures(_PAGE, _told(issued), made_at=_made_at(issued), dots_per_inch=dots_per_inch)


def _told(issued: Issued) -> dict[str, object]:
    made = _made_at(issued)
    qr = qr_squares(issued.url) if issued.url else None
    return {**certificate_told(issued), "qr": qr, "made": [made.year, made.month, made.day]}


def _made_at(issued: Issued) -> datetime:
    return datetime.fromisoformat(issued.document["issued_at"])
