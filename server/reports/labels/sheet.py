"""Labels as PDF and pictures, each with a QR code in whole dots of the printer."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from datetime import datetime
from typing import Any, TypeVar

from server.lab.refusal import Unacceptable
from server.reports.labels.bottle_label import BottleLabel, bottle_url, label_told
from server.reports.labels.stock import Stock
from server.reports.qr_code import QUIET_ZONE, qr_squares
from server.reports.typesetting import TypesettingProblem, set_pdf, set_pictures

_PAGE = "labels"
_INCH = 25.4
_LEAST_MODULE, _MOST_MODULE = 0.5, 0.85
_MOST_LABELS = 500
#: What the page says where a label's text does not fit.
_TOO_SMALL = "does not fit"
#: Parts of a label's width that its QR code may take, the largest first.
_QR_SHARES = (0.48, 0.4, 0.33, 0.27, 0.22, 0.18)
_Made = TypeVar("_Made")


@dataclass(frozen=True, slots=True)
class Printing:
    """How labels are printed.

    ``base_url`` is the laboratory's own address, ``first_place`` the first free label of a sheet
    that was begun (from 1), ``dots_per_inch`` those of the printer, ``at`` when it is printed.
    """

    stock: Stock
    base_url: str
    at: datetime
    first_place: int = 1
    dots_per_inch: int = 600


def labels_pdf(labels: Sequence[BottleLabel], printing: Printing) -> bytes:
    """Return the labels as PDF, on as many sheets as they need.

    Raises:
        Unacceptable: no label, too many, a place that the sheet has not, text or QR code that does
            not fit, hazards that nobody confirmed.
    """
    return _first_that_fits(
        lambda told: set_pdf(_PAGE, told, made_at=printing.at), labels, printing
    )


def labels_pictures(labels: Sequence[BottleLabel], printing: Printing) -> list[bytes]:
    """Return the labels' sheets as PNG pictures, a dot of the printer for a dot of the picture.

    Raises:
        Unacceptable: as ``labels_pdf``.
    """
    dots = printing.dots_per_inch
    return _first_that_fits(
        lambda told: set_pictures(_PAGE, told, made_at=printing.at, dots_per_inch=dots),
        labels,
        printing,
    )


def _first_that_fits(
    make: Callable[[dict[str, Any]], _Made], labels: Sequence[BottleLabel], printing: Printing
) -> _Made:
    """Make the labels with as large a QR code as leaves room for the words, else in brief words."""
    problem: Exception | None = None
    for brief in (False, True):
        for share in _QR_SHARES:
            try:
                return make(_told(labels, printing, share, brief=brief))
            except TypesettingProblem as found:
                if _TOO_SMALL not in str(found):
                    raise
                problem = found
            except _CodeTooSmall:
                if problem is None:
                    raise
                break
    size = f"{printing.stock.width:g} × {printing.stock.height:g} mm"
    says = f"What a label must say does not fit on {size} in letters that can be read (7 pt)."
    raise Unacceptable(says, field="stock", example="a larger label") from problem


class _CodeTooSmall(Unacceptable):
    """A QR code's modules would be too small to be read."""


def module_size(modules: int, room: float, dots_per_inch: int) -> float:
    """Return the side of a QR code's module in mm: whole dots, as large as fits, at most 0.85 mm.

    ``modules`` counts the quiet zone, ``room`` is the side in mm that the code may take.

    Raises:
        Unacceptable: the module would be smaller than 0.5 mm.
    """
    dot = _INCH / dots_per_inch
    side = min(room / modules, _MOST_MODULE)
    module = int(side / dot + 1e-9) * dot
    if module < _LEAST_MODULE:
        says = (
            f"The QR code would have modules of {module:.2f} mm, and needs {_LEAST_MODULE} mm: "
            "choose a larger label or a shorter address."
        )
        raise _CodeTooSmall(says, field="stock", example="100x50")
    return module


def _told(
    labels: Sequence[BottleLabel], printing: Printing, share: float, *, brief: bool
) -> dict[str, Any]:
    if not 1 <= len(labels) <= _MOST_LABELS:
        raise Unacceptable(f"Choose from 1 to {_MOST_LABELS} labels.", field="labels")
    stock = printing.stock
    if not 1 <= printing.first_place <= stock.places:
        says = f"The first free place is from 1 to {stock.places}."
        raise Unacceptable(says, field="first_place", example="1")
    if not 150 <= printing.dots_per_inch <= 2400:
        says = "A printer has from 150 to 2400 dots per inch."
        raise Unacceptable(says, field="dots_per_inch", example="203")
    return {
        "page": {"width": stock.page_width, "height": stock.page_height},
        "width": stock.width,
        "height": stock.height,
        "labels": [
            _label(label, printing, place, share=share, brief=brief)
            for place, label in enumerate(labels, start=printing.first_place - 1)
        ],
    }


def _label(
    label: BottleLabel, printing: Printing, place: int, *, share: float, brief: bool
) -> dict[str, Any]:
    stock = printing.stock
    page, on_page = divmod(place, stock.places)
    x, y = stock.corner(on_page)
    url = bottle_url(printing.base_url, label.code)
    qr = qr_squares(url)
    across = qr["size"] + 2 * QUIET_ZONE
    room = min(stock.height, share * stock.width)
    module = module_size(across, room, printing.dots_per_inch)
    return {
        **label_told(label, brief=brief),
        "page": page,
        "x": x,
        "y": y,
        "url": url,
        "qr": {
            "runs": qr["runs"],
            "module": module,
            "side": across * module,
            "x": _whole_dots(x, printing) + QUIET_ZONE * module,
            "y": _whole_dots(y + (stock.height - across * module) / 2, printing)
            + QUIET_ZONE * module,
        },
    }


def _whole_dots(at: float, printing: Printing) -> float:
    dot = _INCH / printing.dots_per_inch
    return round(at / dot) * dot
