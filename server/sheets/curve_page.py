"""The page of one curve, and the curves of a sheet for other pages."""

from collections.abc import Mapping
from dataclasses import dataclass
from datetime import datetime
from typing import Any

from sqlalchemy.orm import Session

from server.drawing.titration.chart_data import chart_data
from server.evaluation.sheet_curves import SheetCurve, curves_of_sheet
from server.lab.actor import Actor
from server.lab.refusal import NotFound
from server.lab.sheet_facts import SheetFacts
from server.records.queries.load_sheet import load_sheet_facts
from server.sheets.curves import CurvePage, CurveView
from server.sheets.parts.curve_drawn import drawn_of, gran_of, residuals_of, steps_of
from server.sheets.parts.curve_points import points_part
from server.sheets.parts.curve_view import curve_url
from server.sheets.parts.curve_views import view_of
from server.sheets.parts.doors import need_reader
from server.sheets.parts.sheet_lines import sheet_title


@dataclass(frozen=True, slots=True)
class ReadCurve:
    """A sheet read for the page of one of its curves, not analysed yet."""

    facts: SheetFacts
    replicate: int
    first: int | None


def read_curve(
    session: Session,
    sheet_id: str,
    replicate: int,
    first: int | None = None,
    *,
    actor: Actor | None,
    now: datetime,
) -> ReadCurve:
    """Return what a curve's page is made of; close the transaction before analysing it.

    Raises:
        NotFound: there is no such sheet.
        NotSignedIn: a visitor.
    """
    del now
    need_reader(actor)
    return ReadCurve(load_sheet_facts(session, sheet_id), replicate, first)


def curve_page(read: ReadCurve) -> CurvePage:
    """Return the page of a curve that was read.

    Raises:
        NotFound: this replicate has no curve.
    """
    facts = read.facts
    curves = curves_of_sheet(facts)
    told = _of(curves, read.replicate)
    url = curve_url(facts.id, told.replicate)
    return CurvePage(
        sheet_id=facts.id,
        number=facts.number,
        state=facts.state,
        title=sheet_title(facts.lot.titrant, facts.lot.nominal),
        lot_code=facts.lot.code,
        lot_name=facts.lot.name,
        curve=view_of(facts, told),
        table=points_part(told.curve, told.analysis, first=read.first, url=url),
        others=tuple(
            (one.label, curve_url(facts.id, one.replicate))
            for one in curves
            if one.replicate != told.replicate
        ),
    )


def curve_part(read: ReadCurve) -> CurveView:
    """Return one curve of a sheet that was read.

    Raises:
        NotFound: this replicate has no curve.
    """
    return view_of(read.facts, _of(curves_of_sheet(read.facts), read.replicate))


def curve_document(read: ReadCurve) -> Mapping[str, Any]:
    """Return one curve as a JSON-able document: ``equivalence/1`` with the sheet's choice.

    Raises:
        NotFound: this replicate has no curve.
    """
    told = _of(curves_of_sheet(read.facts), read.replicate)
    found = told.analysis.to_document() if told.analysis is not None else None
    return {
        "replicate": told.replicate,
        "label": told.label,
        "entry": told.entry.id,
        "text": told.entry.text,
        "kind": told.curve.kind,
        "volume_mL": list(told.curve.volume_mL),
        "reading": list(told.curve.reading),
        "seconds": list(told.curve.seconds) if told.curve.seconds is not None else None,
        "taken": told.taken,
        "recipe_method": told.recipe_method,
        "reason": told.changed.reason if told.changed is not None else None,
        "problem": told.problem,
        "equivalence": found,
    }


def curve_chart(read: ReadCurve) -> str:
    """Return one curve's numbers for the chart script, as JSON text.

    Raises:
        NotFound: this replicate has no curve, or its points make none.
    """
    told = _of(curves_of_sheet(read.facts), read.replicate)
    analysis = told.analysis
    if analysis is None:
        raise NotFound(told.problem or "These points make no curve.")
    steps = steps_of(analysis)
    return chart_data(
        drawn_of(analysis, told.taken or analysis.proposed),
        residuals=residuals_of(analysis),
        slopes=([(low + high) / 2 for low, high, _ in steps], [slope for *_, slope in steps]),
        gran=gran_of(analysis),
    )


def _of(curves: tuple[SheetCurve, ...], replicate: int) -> SheetCurve:
    for one in curves:
        if one.replicate == replicate:
            return one
    raise NotFound(f"Replicate {replicate} of this sheet has no curve.")
