"""Forms of a standard lot's life: each with names of its own, for they stand on one page."""

from collections.abc import Callable, Iterator
from contextlib import contextmanager
from typing import Any

from server.lab.refusal import Refusal
from server.procedures.standard_lots import (
    AttachCertificate,
    CountStandardLot,
    OpenStandardLot,
    RecordDrying,
    RecordRetest,
    RecordUse,
    StrikeLotLine,
)
from server.web.forms.typed import Typed


def read_opened(form: Typed, standard_lot_id: str) -> OpenStandardLot:
    """Return the day on which a lot was opened."""
    return OpenStandardLot(standard_lot_id, form.text("opened_day"))


def read_drying_form(form: Typed, standard_lot_id: str) -> RecordDrying:
    """Return a drying."""
    return RecordDrying(
        standard_lot_id,
        ended_at=form.text("drying_ended_at"),
        temperature=form.decimal("drying_temperature"),
        hours=form.decimal("drying_hours"),
        desiccator=form.text("drying_desiccator") == "yes",
        says=form.text("drying_says"),
    )


def read_use(form: Typed, standard_lot_id: str) -> RecordUse:
    """Return a use that no sheet holds."""
    return RecordUse(standard_lot_id, form.decimal("use_mass_g"), form.text("use_says"))


def read_count(form: Typed, standard_lot_id: str) -> CountStandardLot:
    """Return what is there by weighing it."""
    return CountStandardLot(standard_lot_id, form.decimal("count_mass_g"), form.text("count_says"))


def read_retest(form: Typed, standard_lot_id: str) -> RecordRetest:
    """Return a re-test."""
    return RecordRetest(
        standard_lot_id,
        done_on=form.text("retest_done_on"),
        next_on=form.text("retest_next_on"),
        says=form.text("retest_says"),
    )


def read_strike(form: Typed, standard_lot_id: str) -> StrikeLotLine:
    """Return a line to be struck through."""
    return StrikeLotLine(standard_lot_id, form.text("strike_line_id"), form.text("strike_reason"))


def read_certificate_file(form: Typed, standard_lot_id: str) -> AttachCertificate:
    """Return the file of a certificate."""
    file = form.file("certificate_file")
    return AttachCertificate(
        standard_lot_id,
        file_name=file.name if file else "",
        content_base64=file.base64 if file else "",
        reason=form.text("certificate_reason"),
    )


@contextmanager
def named(prefix: str) -> Iterator[None]:
    """Let a refusal name the field as this form names it."""
    try:
        yield
    except Refusal as refusal:
        fields = {"content_base64": "file", "file_name": "file", "": ""}
        field = refusal.field or ""
        refusal.field = f"{prefix}_{fields.get(field, field)}"
        raise


Reader = Callable[[Typed, str], Any]
