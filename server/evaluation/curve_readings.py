"""The curves of a bench record, each with its end point as the record takes it."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from functools import lru_cache
from math import hypot
from typing import Any

from server.curves.analysis import Analysis
from server.curves.circumstances import Circumstances
from server.curves.entrance import analysed
from server.curves.outcome import EndPoint, Method
from server.curves.points import CurveProblem, Points
from server.evaluation.bench_record import BenchRecord
from server.evaluation.constants import Constants
from server.evaluation.curve_known import (
    USUAL_FLASK_ML,
    asked_method,
    flask_assumed,
    known_of,
    system_of,
)
from server.evaluation.record_fields import RecordProblem
from server.evaluation.replicate_reading import Curve
from server.evaluation.taken_curve import TakenCurve

_KEPT = 128
"""So many analyses stay in memory: those of a bench sheet on which somebody is working."""


@dataclass(frozen=True, slots=True, eq=False)
class CurveReading:
    """A replicate's curve: what was found in it, and the end point that the record takes.

    ``index`` counts the record's replicates from 0; ``stated`` tells whether somebody named the
    method, else it was proposed by the program. ``u_shared_mL`` is what all replicates have in
    common of the end point's standard uncertainty, ``u_own_mL`` what each has for itself.
    ``flask_assumed``: nobody stated the volume in the flask, the fit took a usual one.
    """

    index: int
    label: str
    taken: Method
    proposed: Method
    stated: bool
    volume_mL: float
    u_shared_mL: float
    u_own_mL: float
    system: str
    flask_assumed: bool
    analysis: Analysis

    def as_taken(self) -> TakenCurve:
        """Return what an evaluation and its snapshot keep of this curve."""
        return TakenCurve(
            index=self.index,
            label=self.label,
            taken=self.taken,
            proposed=self.proposed,
            stated=self.stated,
            volume_mL=self.volume_mL,
            u_shared_mL=self.u_shared_mL,
            u_own_mL=self.u_own_mL,
            system=self.system,
            flask_assumed=self.flask_assumed,
            found=self.analysis.to_document(),
        )


def read_curves(record: BenchRecord, constants: Constants) -> tuple[CurveReading, ...]:
    """Return the curves of a record, each read by the method that it states or was proposed.

    An excluded replicate whose curve cannot be read is left out.

    Raises:
        RecordProblem: a curve that counts is none, or the method asked for has no answer to it.
    """
    found = []
    for index, one in enumerate(record.replicates):
        if one.curve is None:
            continue
        try:
            found.append(_reading(record, constants, index))
        except RecordProblem:
            if one.excluded is None:
                raise
    return tuple(found)


@lru_cache(maxsize=_KEPT)
def analysed_curve(points: Points, known: Circumstances) -> Analysis:
    """Return everything found in a curve; the same curve again costs nothing.

    Raises:
        CurveProblem: the points make no curve.
    """
    return analysed(points, known)


def points_of(curve: Curve) -> Points:
    """Return a record's curve as points."""
    return Points(curve.kind, curve.volume_mL, curve.reading, curve.seconds)


def _reading(record: BenchRecord, constants: Constants, index: int) -> CurveReading:
    one = record.replicates[index]
    path = f"replicates[{index}]"
    if one.curve is None:
        raise RecordProblem(f"{path}.curve", "This replicate has no curve.")
    points = points_of(one.curve)
    try:
        known = known_of(record, constants, one)
        analysis = analysed_curve(points, known)
    except CurveProblem as problem:
        raise RecordProblem(f"{path}.curve", problem.says) from problem
    asked = asked_method(record, one)
    taken = asked or analysis.proposed
    found = analysis.outcome(taken)
    if not isinstance(found, EndPoint):
        says = f"Replicate {one.label}: the {taken} has no answer for this curve. {found.why}"
        able = able_methods(analysis)
        says += f" What has one: {', '.join(able)}." if able else ""
        of_replicate = asked is None or one.curve.method is not None
        at = f"{path}.method" if of_replicate else "end_point.method"
        raise RecordProblem(at, says, f'"{analysis.proposed}"')
    shared, own = _shares(analysis, found)
    assumed = flask_assumed(record, one)
    if assumed:
        shared = hypot(shared, _flask_part(points, known, found))
    return CurveReading(
        index=index,
        label=one.label,
        taken=taken,
        proposed=analysis.proposed,
        stated=asked is not None,
        volume_mL=found.volume_mL,
        u_shared_mL=shared,
        u_own_mL=own,
        system=system_of(record),
        flask_assumed=assumed,
        analysis=analysis,
    )


def able_methods(analysis: Analysis) -> tuple[Method, ...]:
    """Return the methods that have an answer for a curve."""
    return tuple(one.method for one in analysis.outcomes if isinstance(one, EndPoint))


def _shares(analysis: Analysis, found: EndPoint) -> tuple[float, float]:
    """Return what replicates share of an end point's u, and what each has for itself, in mL.

    What the model takes as known is the same in every replicate, the points' scatter is not. Of
    the other methods nobody tells the two apart, so that all of their u is taken as shared.
    """
    if found.method == "model fit" and analysis.fitted is not None:
        uncertainty = analysis.fitted.uncertainty
        return uncertainty.model_mL, uncertainty.fit_mL
    return found.u_mL, 0.0


def _flask_part(points: Points, known: Circumstances, found: EndPoint) -> float:
    """Return the u that a flask's volume brings in mL where it may be half to twice as much."""
    moved = []
    for times in (0.5, 2.0):
        other = replace(known, flask_volume_mL=times * (known.flask_volume_mL or USUAL_FLASK_ML))
        there = analysed_curve(points, other).outcome(found.method)
        if isinstance(there, EndPoint):
            moved.append(abs(there.volume_mL - found.volume_mL))
    return max(moved, default=found.u_mL) / 3**0.5


def taken_of(record: BenchRecord, constants: Constants) -> tuple[TakenCurve, ...]:
    """Return what an evaluation keeps of a record's curves.

    Raises:
        RecordProblem: as ``read_curves``.
    """
    return tuple(one.as_taken() for one in read_curves(record, constants))


def read_taken(documents: Sequence[Mapping[str, Any]]) -> tuple[TakenCurve, ...]:
    """Return the curves that a snapshot holds."""
    return tuple(TakenCurve(**one) for one in documents)
