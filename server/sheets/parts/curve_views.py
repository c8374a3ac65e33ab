"""All curves of a sheet as pages show them."""

from server.evaluation.sheet_curves import SheetCurve, curves_of_sheet
from server.lab.curve_entry import SLOT
from server.lab.sheet_facts import SheetFacts
from server.lab.states import OPEN, SENT_BACK
from server.sheets.curves import CurveView
from server.sheets.parts.curve_view import curve_view

_PROBE = "probe"


def curve_views(facts: SheetFacts) -> tuple[CurveView, ...]:
    """Return all curves that stand on a sheet, in order of replicates."""
    if not any(entry.slot == SLOT for entry in facts.entries):
        return ()
    return tuple(view_of(facts, told) for told in curves_of_sheet(facts))


def view_of(facts: SheetFacts, told: SheetCurve) -> CurveView:
    """Return one curve of a sheet; where it was evaluated, with the volume that was signed."""
    return curve_view(
        told,
        sheet_id=facts.id,
        zone=facts.laboratory.zone,
        probe=facts.instrument(_PROBE),
        signed_mL=_signed(facts, told.label),
    )


def _signed(facts: SheetFacts, label: str) -> float | None:
    """Return the volume that the evaluation of a handed-in sheet has for a curve, in mL."""
    if facts.evaluation is None or facts.state in {OPEN, SENT_BACK}:
        return None
    for row in facts.evaluation.result.get("methods") or ():
        if row["label"] == label:
            return float(row["volume_mL"])
    return None
