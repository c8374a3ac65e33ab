"""From what was kept of a print to its labels: the same print gives the same bytes."""

from collections.abc import Sequence
from datetime import date, datetime

from server.chemistry.substances import name_of
from server.lab.label_hazards import SolutionHazards
from server.lab.label_print import LabelStock, LabelText, LabelValue
from server.reports.labels.bottle_label import (
    BottleLabel,
    ConfirmedHazards,
    PrintedValue,
    Reprint,
)
from server.reports.labels.sheet import Printing, labels_pdf, labels_pictures
from server.reports.labels.stock import SHEETS, find_stock
from server.sheets.parts.shelf_state import nominal_words
from server.sheets.parts.telling import typed_day_words

#: Single labels that are offered beside the sheets; any other size can be typed.
SINGLES = ("100x50", "62x40", "62x29", "50x30")


def print_pdf(texts: Sequence[LabelText], onto: LabelStock, *, at: datetime) -> bytes:
    """Return the labels of a print as PDF.

    Raises:
        Unacceptable: a stock, place or printer that is none; words that do not fit.
    """
    return labels_pdf([_label(one, at) for one in texts], _printing(onto, at))


def print_pictures(texts: Sequence[LabelText], onto: LabelStock, *, at: datetime) -> list[bytes]:
    """Return the sheets of a print as PNG pictures, a dot of the printer for a dot of the picture.

    Raises:
        Unacceptable: as ``print_pdf``.
    """
    return labels_pictures([_label(one, at) for one in texts], _printing(onto, at))


def stock_choices() -> tuple[tuple[str, str], ...]:
    """Return the label stocks that are offered, each with its name for people."""
    singles = ((size, find_stock(size).name) for size in SINGLES)
    return (*singles, *((key, stock.name) for key, stock in SHEETS.items()))


def _printing(onto: LabelStock, at: datetime) -> Printing:
    return Printing(
        stock=find_stock(onto.stock),
        base_url=onto.base_url,
        at=at,
        first_place=onto.first_place,
        dots_per_inch=onto.dots_per_inch,
    )


def _label(text: LabelText, at: datetime) -> BottleLabel:
    return BottleLabel(
        code=text.code,
        titrant=name_of(text.titrant).capitalize(),
        nominal=nominal_words(text.nominal),
        lot=text.lot,
        bottle=text.bottle,
        made_on=typed_day_words(text.prepared_on),
        laboratory=text.laboratory,
        address=text.address,
        zone=text.zone,
        hazards=_hazards(text.hazards),
        value=_value(text.value),
        reprint=Reprint(text.reason, at) if text.reason else None,
    )


def _value(value: LabelValue | None) -> PrintedValue | None:
    if value is None:
        return None
    return PrintedValue(value.reported, value.certificate, typed_day_words(value.valid_until))


def _hazards(hazards: SolutionHazards | None) -> ConfirmedHazards | None:
    if hazards is None:
        return None
    return ConfirmedHazards(
        pictograms=hazards.pictograms,
        signal_word=hazards.signal_word,
        statements=hazards.statements,
        confirmed_by=hazards.confirmed_by,
        confirmed_on=date.fromisoformat(hazards.confirmed_on),
    )
