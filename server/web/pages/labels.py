"""Labels of bottles: chosen, printed, and the log of what was printed."""

from typing import Any

from fastapi import APIRouter, Request, Response

from server.procedures.labels import PrintLabels
from server.reports.labels.printing import stock_choices
from server.reports.labels.stock import find_stock
from server.sheets.labels import LabelJob
from server.sheets.labels_page import open_label_job, open_labels
from server.web.forms.posts import Again, Posted
from server.web.handing_out import hand_out_labels, show_labels
from server.web.label_prints import print_them
from server.web.showing import show
from server.web.visits import AtDesk

router = APIRouter()
_TEMPLATE = "labels/home.html"


@router.get("/labels")
def home(request: Request, visit: AtDesk, thing: str = "") -> Response:
    """Show the bottles of a lot with their labels, or those whose label should be printed anew."""
    return show(visit, _TEMPLATE, open_labels, thing, **_around(request))


@router.post("/labels")
def print_out(request: Request, post: Posted) -> Response:
    """Print labels: write them down, then show them."""
    form = post.form

    def work() -> str:
        command = PrintLabels(
            bottles=form.all("bottles"),
            stock=form.text("size").strip() or form.text("stock"),
            first_place=form.whole("first_place", example="1"),
            dots_per_inch=form.whole("dots_per_inch", example="300"),
            reason=form.text("reason"),
            base_url=own_address(request),
        )
        return f"/labels/prints/{print_them(post.visit, command, key=post.key)}"

    again = Again(_TEMPLATE, open_labels, (form.text("thing"),), more=_around(request))
    return post.answer(work, again=again)


@router.get("/labels/prints/{number}.pdf")
def pdf(visit: AtDesk, number: int) -> Response:
    """Hand out the labels of a print as PDF."""
    return hand_out_labels(visit, number)


@router.get("/labels/prints/{number}.png")
def picture(visit: AtDesk, number: int, sheet: int = 1) -> Response:
    """Show a sheet of a print as a picture, for label printers that take one."""
    return show_labels(visit, number, sheet)


@router.get("/labels/prints/{number}")
def one_print(visit: AtDesk, number: int) -> Response:
    """Show one print."""
    return show(visit, "labels/print.html", open_label_job, number, with_page=_onto)


def own_address(request: Request) -> str:
    """Return the address that this page was opened by."""
    return str(request.base_url).rstrip("/")


def _onto(job: LabelJob) -> dict[str, str]:
    return {"stock_name": find_stock(job.onto.stock).name}


def _around(request: Request) -> dict[str, Any]:
    return {"stocks": stock_choices(), "here_url": own_address(request)}
