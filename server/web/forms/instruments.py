"""Forms of instruments and their calibrations."""

from typing import Any

from server.lab.identity import DESCRIBED
from server.lab.sheet_facts import BALANCE, BURETTE, FLASK, PIPETTE, PROBE, THERMOMETER
from server.procedures.calibration_runs import StateClass
from server.procedures.instrument_log import SetLimits, StrikeLine, WriteCheck
from server.procedures.instruments import (
    DescribeInstrument,
    RecordCalibration,
    RegisterInstrument,
)
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
        verification=form.text("verification"),
        adjustments=form.text("adjustments"),
        acceptance=form.text("acceptance"),
        references=form.text("references"),
    )


def read_description(form: Typed, instrument_id: str) -> DescribeInstrument:
    """Return what describes an instrument anew, beside what stood when the form was opened."""
    return DescribeInstrument(
        instrument_id=instrument_id,
        described={key: form.text(key) for key in DESCRIBED if key in form.values},
        reason=form.text("reason"),
        seen={key: form.text(f"seen_{key}") for key in DESCRIBED},
    )


def read_class(form: Typed, instrument_id: str) -> StateClass:
    """Return a class tolerance that shall serve."""
    return StateClass(
        instrument_id=instrument_id,
        nominal=form.decimal("nominal"),
        done_on=form.text("done_on"),
        due_on=form.text("due_on"),
        due_basis=form.text("due_basis"),
        ware=form.text("ware"),
        grade=form.text("grade"),
        division=form.decimal("division"),
        glass_expansion=form.decimal("glass_expansion"),
        shape=form.text("shape", "triangular"),
        issuer=form.text("issuer") or "maker's class mark",
    )


def read_limits(form: Typed, instrument_id: str, kind: str) -> SetLimits:
    """Return the limits of a check: of first readings, or stated."""
    keys = ("set", "buffer") if kind == PROBE else ("name",)
    numbers = ("step", "centre", "warning", "action")
    document: dict[str, Any] = {key: form.text(key).strip() for key in keys}
    document |= {key: form.decimal(key) for key in numbers if form.decimal(key)}
    first = [one.replace(",", ".") for one in form.text("first").split()]
    if first and kind != PROBE:
        document["first"] = first
    return SetLimits(instrument_id, document)


def read_check(form: Typed, instrument_id: str) -> WriteCheck:
    """Return a check as it was read."""
    return WriteCheck(
        instrument_id=instrument_id,
        chart=form.text("chart"),
        reading=form.decimal("reading"),
        pH=form.decimal("pH"),
        temperature=form.decimal("temperature"),
        remark=form.text("remark"),
    )


def read_strike(form: Typed, instrument_id: str) -> StrikeLine:
    """Return which line is struck through, and why."""
    return StrikeLine(instrument_id, form.text("line_id"), form.text("strike_reason"))


def read_calibration_form(
    form: Typed, instrument_id: str, kind: str, *, file_id: str | None = None
) -> RecordCalibration:
    """Return a calibration of an instrument of a kind, as its certificate states it."""
    return RecordCalibration(
        instrument_id=instrument_id,
        certificate_number=form.text("certificate_number"),
        issuer=form.text("issuer"),
        done_on=form.text("done_on"),
        due_on=form.text("due_on"),
        due_basis=form.text("due_basis"),
        document=_document(form, kind),
        file_id=file_id,
    )


def _document(form: Typed, kind: str) -> dict[str, Any]:
    stated: dict[str, Any]
    if kind == BALANCE:
        stated = {
            "linearity": quantity(form, "linearity"),
            "error_u": quantity(form, "error_u"),
            "error_table": table(form, "error_table"),
            "minimum_g": form.decimal("minimum_g") or None,
        }
    elif kind == BURETTE:
        capacity = form.decimal("capacity_value")
        stated = {
            "capacity": {"value": capacity, "unit": "mL"} if capacity else None,
            "delivery": quantity(form, "delivery"),
            "glass_expansion": form.decimal("glass_expansion") or None,
            "error_table": table(form, "error_table"),
        }
    elif kind in {PIPETTE, FLASK}:
        name = "volume" if kind == FLASK else "delivery"
        stated = {
            name: quantity(form, name),
            "glass_expansion": form.decimal("glass_expansion") or None,
        }
    elif kind == PROBE:
        keys = ("slope_percent", "u_slope_percent", "offset_mV", "u_offset_mV")
        stated = {key: form.decimal(key) or None for key in keys}
    elif kind == THERMOMETER:
        stated = {
            "reading": quantity(form, "reading"),
            "error_table": table(form, "error_table"),
        }
    else:
        stated = {name: quantity(form, name) for name in ("temperature", "pressure", "humidity")}
    return {name: value for name, value in stated.items() if value is not None}
