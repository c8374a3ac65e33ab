"""Files that leave the laboratory, made with nothing open; page and API hand out the same."""

from datetime import UTC

from fastapi import Response

from server.lab.refusal import Unacceptable
from server.reports.certificate.files import FileOut, Pen, certificate_file
from server.reports.certificate.gathering import gather_certificate
from server.reports.dcc.certificate import About
from server.reports.labels.printing import print_pdf, print_pictures
from server.reports.lot.archive import Made, lot_archive
from server.reports.lot.gathering import gather_lot
from server.sheets.labels_page import open_label_job
from server.web.pages.files import attachment
from server.web.visits import Visit

STATE_HEADER = "Certificate-State"


def hand_out_certificate(visit: Visit, number: str, kind: str) -> Response:
    """Return a file of a certificate; ``Certificate-State`` says what it is worth today."""
    gathered = visit.read(gather_certificate, number)
    made: FileOut = certificate_file(gathered, kind, Pen(visit.parts.keys, visit.parts.version))
    response = attachment(made.content, made.name, made.media_type)
    response.headers[STATE_HEADER] = made.state
    return response


def hand_out_lot(visit: Visit, code: str) -> Response:
    """Return all of a lot in one ZIP archive."""
    bundle = visit.read(gather_lot, code)
    about = About(bundle.country, visit.parts.version) if bundle.country else None
    content = lot_archive(bundle, Made(visit.parts.keys, about))
    name = f"lot-{bundle.code}-{visit.now.astimezone(UTC):%Y-%m-%d}.zip"
    return attachment(content, name, "application/zip")


def hand_out_labels(visit: Visit, number: int) -> Response:
    """Return the labels of a print as PDF."""
    job = visit.read(open_label_job, number)
    content = print_pdf(job.texts, job.onto, at=job.made_at)
    return attachment(content, f"labels-{number}.pdf", "application/pdf")


def show_labels(visit: Visit, number: int, sheet: int) -> Response:
    """Return a sheet of a print as a picture, a dot of the printer for a dot of the picture."""
    job = visit.read(open_label_job, number)
    pictures = print_pictures(job.texts, job.onto, at=job.made_at)
    if not 1 <= sheet <= len(pictures):
        raise Unacceptable(f"sheet is from 1 to {len(pictures)}.", field="sheet", example="1")
    return Response(pictures[sheet - 1], media_type="image/png")
