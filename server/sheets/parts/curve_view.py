"""One curve of a sheet as pages show it."""

from collections.abc import Iterator

from server.curves.analysis import Analysis
from server.curves.outcome import EndPoint, Outcome
from server.drawing.titration.told import method_mark
from server.evaluation.sheet_curves import SheetCurve
from server.lab.sheet_facts import InstrumentFact
from server.sheets.curves import CurveFindingView, CurveMethod, CurveView
from server.sheets.parts.curve_drawn import NOTHING_DRAWN, drawn_of, pictures_of, steps_of
from server.sheets.parts.curve_probe import probe_beside
from server.sheets.parts.curve_words import apart_words, believe, picture_says, the, volume_words
from server.sheets.parts.telling import moment_words

_LEANS = (
    " It leans on the reaction that was named: residuals and pK tell whether that is what was in "
    "the flask."
)
_SAME_ML = 1e-6
_GRAVITY = {"fails": 0, "look": 1, "holds": 2}


def curve_url(sheet_id: str, replicate: int) -> str:
    """Return the address of a curve's page."""
    return f"/sheets/{sheet_id}/curves/{replicate}"


def curve_view(
    told: SheetCurve,
    *,
    sheet_id: str,
    zone: str,
    probe: InstrumentFact | None,
    signed_mL: float | None = None,
) -> CurveView:
    """Return a curve with every method, its findings and its pictures.

    ``signed_mL`` is the volume that an evaluation keeps; where the program finds another today, the
    view says so.
    """
    entry, analysis = told.entry, told.analysis
    taken = told.taken or (analysis.proposed if analysis else None)
    outcomes = analysis.outcomes if analysis else ()
    found = next((one for one in outcomes if one.method == taken), None)
    volume, u = volume_words(found) if isinstance(found, EndPoint) else ("", "")
    says = picture_says(analysis, taken or "", steps_of(analysis)) if analysis else ""
    return CurveView(
        replicate=told.replicate,
        label=told.label,
        url=curve_url(sheet_id, told.replicate),
        chart_url=f"/api{curve_url(sheet_id, told.replicate)}/chart",
        points=len(told.curve.volume_mL),
        kind=told.curve.kind,
        words=entry.text,
        written=f"{moment_words(entry.received_at, zone)} by {entry.printed_name}",
        file_url=f"/files/{entry.file_id}" if entry.file_id else None,
        set_aside=tuple(f"row {one.row}: {one.says}" for one in told.curve.set_aside),
        problem=told.problem or _not_as_signed(found, signed_mL),
        taken=taken,
        volume=volume,
        u=u,
        choice=_choice(told, taken, zone) + (apart_words(analysis, taken) if analysis else ""),
        believe=believe(analysis) if analysis else "",
        says=says,
        methods=tuple(_methods(analysis, taken)) if analysis else (),
        other_step=tuple(_method(one) for one in analysis.other_step) if analysis else (),
        findings=findings_of(analysis) if analysis else (),
        probe=probe_beside(analysis, probe) if analysis else None,
        pictures=(
            pictures_of(analysis, drawn_of(analysis, taken or ""), says=says)
            if analysis
            else NOTHING_DRAWN
        ),
    )


def _not_as_signed(found: Outcome | None, signed_mL: float | None) -> str | None:
    if signed_mL is None or not isinstance(found, EndPoint):
        return None
    if abs(found.volume_mL - signed_mL) <= _SAME_ML:
        return None
    return (
        f"The sheet was signed with {signed_mL:.6g} mL; this release of the program finds "
        f"{found.volume_mL:.6g} mL. What was signed stays as it was."
    )


def findings_of(analysis: Analysis) -> tuple[CurveFindingView, ...]:
    """Return what was looked at in a curve, the gravest first."""
    ordered = sorted(analysis.findings, key=lambda one: _GRAVITY[one.verdict])
    return tuple(CurveFindingView(one.name, one.verdict, one.says, one.basis) for one in ordered)


def _choice(told: SheetCurve, taken: str | None, zone: str) -> str:
    """Return who chose the method that counts, and why."""
    changed = told.changed
    if changed is not None:
        who = f"{changed.printed_name}, {moment_words(changed.received_at, zone)}"
        says = f"Taken by {the(taken or '')} by an entry of {who}: {changed.reason}."
        return says + (
            f" The recipe names {the(told.recipe_method)}." if told.recipe_method else ""
        )
    if told.recipe_method is not None:
        return f"Taken by {the(told.recipe_method)}, as the recipe says."
    return f"Nobody named a method: the program proposes {the(taken)}." if taken else ""


def _methods(analysis: Analysis, taken: str | None) -> Iterator[CurveMethod]:
    for one in analysis.outcomes:
        yield _method(one, taken=taken, proposed=analysis.proposed)


def _method(one: Outcome, *, taken: str | None = None, proposed: str | None = None) -> CurveMethod:
    if not isinstance(one, EndPoint):
        return CurveMethod(one.method, method_mark(one.method), None, None, 0, one.why,
                           taken=one.method == taken, proposed=False)  # fmt: skip
    volume, u = volume_words(one)
    return CurveMethod(
        method=one.method,
        shape=method_mark(one.method, taken=one.method == taken),
        volume=volume,
        u=u,
        points_used=len(one.used),
        says=one.says + (_LEANS if one.method == "model fit" else ""),
        taken=one.method == taken,
        proposed=one.method == proposed,
    )
