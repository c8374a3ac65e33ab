"""A certificate as a page."""

from fastapi import APIRouter, Response

from server.sheets.certificate_page import open_certificate
from server.web.showing import show
from server.web.visits import AtDesk

router = APIRouter()


@router.get("/certificates/{number}")
def certificate(visit: AtDesk, number: str) -> Response:
    """Show a certificate and its state today."""
    return show(visit, "certificates/certificate.html", open_certificate, number)
