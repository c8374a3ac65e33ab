"""Forms of instruments and their calibrations."""

from typing import Any

from server.lab.sheet_facts import BALANCE, BURETTE, THERMOMETER
from server.procedures.instruments import RecordCalibration, RegisterInstrument
from server.web.forms.fields import quantity, table
from server.web.forms.typed import Typed


def read_instrument(form: Typed) -> RegisterInstrument:
    """Return an instrument's identity."""
    return RegisterInstrument(
        kind=form.text("kind"),
        name=form.text("name"),
        maker=form.text("maker"),
        type=form.text("type"),
        serial=form.text("serial"),
        location=form.text("location"),
        resolution=form.decimal("resolution"),
        capacity=form.decimal("capacity"),
        decimals=form.text("decimals").strip(),
        minimum_g=form.decimal("minimum_g"),
        software=form.text("software"),
    )


def read_calibration_form(form: Typed, instrument_id: str, kind: str) -> RecordCalibration:
    """Return a calibration of an instrument of a kind, as its certificate states it."""
    return RecordCalibration(
        instrument_id=instrument_id,
        certificate_number=form.text("certificate_number"),
        issuer=form.text("issuer"),
        done_on=form.text("done_on"),
        due_on=form.text("due_on"),
        due_basis=form.text("due_basis"),
        document=_document(form, kind),
    )


def _document(form: Typed, kind: str) -> dict[str, Any]:
    stated: dict[str, Any]
    if kind == BALANCE:
        stated = {
            "linearity": quantity(form, "linearity"),
            "error_u": quantity(form, "error_u"),
            "error_table": table(form, "error_table"),
        }
    elif kind == BURETTE:
        capacity = form.decimal("capacity_value")
        stated = {
            "capacity": {"value": capacity, "unit": "mL"} if capacity else None,
            "delivery": quantity(form, "delivery"),
            "glass_expansion": form.decimal("glass_expansion") or None,
            "error_table": table(form, "error_table"),
        }
    elif kind == THERMOMETER:
        stated = {"reading": quantity(form, "reading")}
    else:
        stated = {name: quantity(form, name) for name in ("temperature", "pressure", "humidity")}
    return {name: value for name, value in stated.items() if value is not None}
