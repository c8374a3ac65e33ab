"""Certificates over the API."""

from typing import Any

from fastapi import APIRouter, Response

from server.reports.certificate.files import KINDS
from server.sheets.certificate_page import open_certificate_document
from server.web.api.desk import answer
from server.web.handing_out import STATE_HEADER, hand_out_certificate
from server.web.visits import AtDesk

router = APIRouter(tags=["certificates"])


def _file(kind: str) -> dict[int | str, dict[str, Any]]:
    """Return what the API's own document says of a file."""
    return {
        200: {
            "description": f"The file. {STATE_HEADER} says what the certificate is worth today.",
            "content": {KINDS[kind][0]: {}},
        }
    }


# files first: a number with an ending is not that of a certificate
@router.get("/certificates/{number}.pdf", responses=_file("pdf"), response_class=Response)
def pdf(visit: AtDesk, number: str) -> Response:
    """Hand out the printed certificate: PDF/A-3 with document and signature attached."""
    return hand_out_certificate(visit, number, "pdf")


@router.get("/certificates/{number}.jws", responses=_file("jws"), response_class=Response)
def signed(visit: AtDesk, number: str) -> Response:
    """Hand out the document signed by the laboratory (RFC 7515, keys at /.well-known/jwks.json)."""
    return hand_out_certificate(visit, number, "jws")


@router.get("/certificates/{number}.dcc.xml", responses=_file("dcc.xml"), response_class=Response)
def dcc(visit: AtDesk, number: str) -> Response:
    """Hand out the certificate as a digital calibration certificate (DCC 3.3.0)."""
    return hand_out_certificate(visit, number, "dcc.xml")


@router.get(
    "/certificates/{number}.bench-record.json",
    responses=_file("bench-record.json"),
    response_class=Response,
)
def bench_record(visit: AtDesk, number: str) -> Response:
    """Hand out the bench record that ``evaluate`` computes the number from again."""
    return hand_out_certificate(visit, number, "bench-record.json")


@router.get("/certificates/{number}.json", responses=_file("json"), response_class=Response)
def document(visit: AtDesk, number: str) -> Response:
    """Hand out the document in its canonical text, whose SHA-256 is its digest."""
    return hand_out_certificate(visit, number, "json")


@router.get("/certificates/{number}")
def certificate(visit: AtDesk, number: str) -> Response:
    """Tell a certificate's issued document and its state today."""
    return answer(visit.read(open_certificate_document, number))
