"""Forms of bench and countersign."""

from server.lab.refusal import Unacceptable
from server.lab.sheet_facts import RowRemark
from server.procedures.bench import BeginSheet
from server.procedures.countersign import Countersign
from server.procedures.hand_in import HandIn
from server.procedures.send_back import SendBack
from server.web.forms.typed import Typed
from server.web.signing import Given

_REASON = "reason."
_AT_ROW = "at."


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


def read_signer(form: Typed) -> Given:
    """Return what a signer gave of herself: name and password."""
    return Given(form.text("name"), form.text("password"))


def read_countersign(form: Typed, sheet_id: str) -> Countersign:
    """Return a second signature with the findings that it accepts by name."""
    seen = form.whole("trail_seen", example="143") if form.text("trail_seen") else 0
    return Countersign(
        sheet_id=sheet_id,
        revision=form.whole("revision", example="7"),
        accepted=form.all("accepted"),
        remark=form.text("remark"),
        trail_seen=seen,
        because=form.text("because"),
    )


def read_send_back(form: Typed, sheet_id: str) -> SendBack:
    """Return a sheet sent back; a remark on a row stands in ``at.replicate.slot.segment``.

    Raises:
        Unacceptable: a field names no row.
    """
    remarks = tuple(
        _row_remark(name, form.text(name))
        for name in form.values
        if name.startswith(_AT_ROW) and form.text(name).strip()
    )
    revision = form.whole("revision", example="7")
    return SendBack(sheet_id, revision, form.text("remark"), remarks)


def _row_remark(name: str, text: str) -> RowRemark:
    replicate, _, rest = name.removeprefix(_AT_ROW).partition(".")
    slot, _, segment = rest.rpartition(".")
    if not (_is_small(replicate) and slot and _is_small(segment)):
        raise Unacceptable(f"{name[:60]} names no row.", field=name[:60])
    return RowRemark(int(replicate), slot, text, int(segment))


def _is_small(text: str) -> bool:
    return text.isascii() and text.isdigit() and len(text) <= 3
