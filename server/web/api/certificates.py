"""Certificates over the API."""

from fastapi import APIRouter, Response

from server.sheets.certificate_page import open_certificate_document
from server.web.api.desk import answer
from server.web.visits import AtDesk

router = APIRouter(tags=["certificates"])


@router.get("/certificates/{number}")
def certificate(visit: AtDesk, number: str) -> Response:
    """Tell a certificate's issued document and its state today."""
    return answer(visit.read(open_certificate_document, number))
