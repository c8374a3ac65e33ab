"""A certificate as a page, and its files."""

from fastapi import APIRouter, Response

from server.sheets.certificate_page import open_certificate
from server.web.handing_out import hand_out_certificate
from server.web.showing import show
from server.web.visits import AtDesk

router = APIRouter()


# files first: a number with an ending is not that of a certificate
@router.get("/certificates/{number}.pdf")
def pdf(visit: AtDesk, number: str) -> Response:
    """Hand out the printed certificate, the signed document inside."""
    return hand_out_certificate(visit, number, "pdf")


@router.get("/certificates/{number}.jws")
def signed(visit: AtDesk, number: str) -> Response:
    """Hand out the document signed by the laboratory."""
    return hand_out_certificate(visit, number, "jws")


@router.get("/certificates/{number}.dcc.xml")
def dcc(visit: AtDesk, number: str) -> Response:
    """Hand out the certificate as a DCC."""
    return hand_out_certificate(visit, number, "dcc.xml")


@router.get("/certificates/{number}.bench-record.json")
def bench_record(visit: AtDesk, number: str) -> Response:
    """Hand out what the number was computed from."""
    return hand_out_certificate(visit, number, "bench-record.json")


@router.get("/certificates/{number}.json")
def document(visit: AtDesk, number: str) -> Response:
    """Hand out the document as it was issued."""
    return hand_out_certificate(visit, number, "json")


@router.get("/certificates/{number}")
def certificate(visit: AtDesk, number: str) -> Response:
    """Show a certificate and its state today."""
    return show(visit, "certificates/certificate.html", open_certificate, number)
