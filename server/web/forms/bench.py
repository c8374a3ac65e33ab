"""Forms of bench and countersign."""

from server.procedures.bench import BeginSheet
from server.procedures.countersign import Countersign
from server.procedures.hand_in import HandIn
from server.web.forms.typed import Typed

_REASON = "reason."


def read_begin(form: Typed) -> BeginSheet:
    """Return what a new sheet shall rest on."""
    return BeginSheet(
        lot_code=form.text("lot_code"),
        recipe_id=form.text("recipe_id"),
        standard_lot_id=form.text("standard_lot_id"),
        balance_id=form.text("balance_id"),
        burette_id=form.text("burette_id"),
        thermometer_id=form.text("thermometer_id") or None,
        room_id=form.text("room_id") or None,
        probe_id=form.text("probe_id") or None,
        override_reason=form.text("override_reason") or None,
    )


def read_signing(form: Typed, sheet_id: str) -> HandIn:
    """Return a hand in with the reasons for what fails, by the names of the findings."""
    reasons = {
        name.removeprefix(_REASON): form.text(name)
        for name in form.values
        if name.startswith(_REASON)
    }
    return HandIn(
        sheet_id=sheet_id,
        revision=form.whole("revision", example="7"),
        reasons=reasons,
        remark=form.text("remark"),
    )


def read_countersign(form: Typed, sheet_id: str) -> Countersign:
    """Return a second signature with the findings that it accepts by name."""
    return Countersign(
        sheet_id=sheet_id,
        revision=form.whole("revision", example="7"),
        accepted=form.all("accepted"),
        remark=form.text("remark"),
    )
