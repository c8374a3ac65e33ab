"""The curves of a bench record, each with its end point as the record takes it."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from functools import lru_cache
from typing import Any

from server.chemistry.equilibria import HIGHEST_C, LOWEST_C
from server.curves.analysis import Analysis
from server.curves.circumstances import Circumstances, system_named
from server.curves.entrance import analysed
from server.curves.outcome import METHODS, EndPoint, Method
from server.curves.points import CurveProblem, Points
from server.evaluation.bench_record import BenchRecord
from server.evaluation.constants import Constants
from server.evaluation.methods.standardization_v1 import model_of
from server.evaluation.record_fields import RecordProblem
from server.evaluation.replicate_reading import Curve, Replicate
from server.evaluation.taken_curve import TakenCurve

_STRONG_ACIDS = frozenset({"HCl", "HBr", "HNO3", "HClO4"})
"""Acids of one proton that water takes whole: what the model of an acid in the burette means."""
_STRONG_BASES = frozenset({"NaOH", "KOH"})
_KEPT = 128
"""So many analyses stay in memory: those of a bench sheet on which somebody is working."""


@dataclass(frozen=True, slots=True, eq=False)
class CurveReading:
    """A replicate's curve: what was found in it, and the end point that the record takes.

    ``index`` counts the record's replicates from 0; ``stated`` tells whether somebody named the
    method, else it was proposed by the program. ``u_shared_mL`` is what all replicates have in
    common of the end point's standard uncertainty, ``u_own_mL`` what each has for itself.
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


def known_of(record: BenchRecord, constants: Constants, one: Replicate) -> Circumstances:
    """Return what is known of a replicate's titration beside its points.

    Raises:
        CurveProblem: a temperature at which the system's constants do not hold.
    """
    model = model_of(record, constants)
    portion = model.portion(one)
    return circumstances_known(
        system_of(record),
        flask_volume_mL=record.end_point.flask_volume_mL if record.end_point else None,
        amount_mmol=model.standard_mmol(portion),
        temperature_C=portion.temperature_C,
    )


def circumstances_known(
    system: str,
    *,
    flask_volume_mL: float | None,
    amount_mmol: float | None,
    temperature_C: float,
) -> Circumstances:
    """Return circumstances of a curve from figures: volumes mL, amounts mmol, temperature °C.

    Without a system the temperature only scales mV, so that it may lie where no constants hold.

    Raises:
        CurveProblem: a system that is not known, or a temperature at which it does not hold.
    """
    named = system_named(system)
    if named is None:
        temperature_C = min(max(temperature_C, LOWEST_C), HIGHEST_C)
    return Circumstances(
        system=named,
        flask_volume_mL=flask_volume_mL,
        amount_mmol=amount_mmol,
        temperature_C=temperature_C,
    )


def system_of(record: BenchRecord) -> str:
    """Return the acid-base system of a record: the stated one, else by titrant and standard."""
    stated = record.end_point.system if record.end_point else None
    if stated is not None:
        return stated
    standard = record.standard.substance if record.standard else None
    return system_between(record.titrant.substance, standard, medium=record.titrant.medium)


def system_between(titrant: str, standard: str | None, *, medium: str) -> str:
    """Return the system of a titrant with a standard in water, ``none`` where none is known."""
    if medium != "water":
        return "none"
    if standard == "KHP" and titrant in _STRONG_BASES:
        return "khp-naoh"
    if standard == "TRIS" and titrant in _STRONG_ACIDS:
        return "tris-hcl"
    if standard == "Na2CO3" and titrant in _STRONG_ACIDS:
        return "carbonate-hcl"
    return "none"


def _reading(record: BenchRecord, constants: Constants, index: int) -> CurveReading:
    one = record.replicates[index]
    path = f"replicates[{index}]"
    if one.curve is None:
        raise RecordProblem(f"{path}.curve", "This replicate has no curve.")
    try:
        analysis = analysed_curve(points_of(one.curve), known_of(record, constants, one))
    except CurveProblem as problem:
        at = "" if problem.index is None else f".volume_mL[{problem.index}]"
        raise RecordProblem(f"{path}.curve{at}", f"{problem.says}") from problem
    asked, asked_at = _asked(record, one, path)
    taken = asked or analysis.proposed
    found = analysis.outcome(taken)
    if not isinstance(found, EndPoint):
        says = f"Replicate {one.label}: the {taken} has no answer for this curve. {found.why}"
        able = able_methods(analysis)
        says += f" What has one: {', '.join(able)}." if able else ""
        raise RecordProblem(asked_at, says, f'"{analysis.proposed}"')
    shared, own = _shares(analysis, found)
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
        analysis=analysis,
    )


def able_methods(analysis: Analysis) -> tuple[Method, ...]:
    """Return the methods that have an answer for a curve."""
    return tuple(one.method for one in analysis.outcomes if isinstance(one, EndPoint))


def _asked(record: BenchRecord, one: Replicate, path: str) -> tuple[Method | None, str]:
    """Return the method that was asked for, the replicate's before the record's, and where."""
    if one.curve is not None and one.curve.method is not None:
        return _named(one.curve.method), f"{path}.method"
    if record.end_point is not None and record.end_point.method is not None:
        return _named(record.end_point.method), "end_point.method"
    return None, f"{path}.method"


def _named(method: str) -> Method | None:
    return next((one for one in METHODS if one == method), None)


def _shares(analysis: Analysis, found: EndPoint) -> tuple[float, float]:
    """Return what replicates share of an end point's u, and what each has for itself, in mL.

    What the model takes as known is the same in every replicate, the points' scatter is not. Of
    the other methods nobody tells the two apart, so that all of their u is taken as shared.
    """
    if found.method == "model fit" and analysis.fitted is not None:
        uncertainty = analysis.fitted.uncertainty
        return uncertainty.model_mL, uncertainty.fit_mL
    return found.u_mL, 0.0


def with_end_points(record: BenchRecord, curves: Sequence[TakenCurve]) -> BenchRecord:
    """Return the record whose curves have a volume: one delivery from 0 to the end point.

    Raises:
        RecordProblem: an end point outside the burette or its error table.
    """
    if not curves:
        return record
    replicates = list(record.replicates)
    for curve in curves:
        one = replicates[curve.index]
        problem = outside_burette(record, one, curve.volume_mL)
        if problem is None:
            replicates[curve.index] = at_volume(one, curve)
        elif one.excluded is None:
            says = f"Replicate {curve.label}, {curve.taken}: {problem}"
            raise RecordProblem(f"replicates[{curve.index}].curve", says)
    return replace(record, replicates=tuple(replicates))


def at_volume(one: Replicate, curve: TakenCurve) -> Replicate:
    """Return a replicate with its end point: the burette's way from 0 to it, or drops counted."""
    if one.curve is not None and one.curve.drop is not None:
        return replace(one, delivered=curve.volume_mL, end_point=curve.end_point())
    return replace(one, segments=((0.0, curve.volume_mL),), end_point=curve.end_point())


def outside_burette(record: BenchRecord, one: Replicate, volume_mL: float) -> str | None:
    """Return in words why a volume cannot have come from the burette, None where it can."""
    table, capacity = record.burette.error_table, record.burette.capacity
    if volume_mL <= 0:
        return f"the end point at {volume_mL:.4g} mL is not above zero."
    if one.curve is not None and one.curve.drop is not None:
        return None
    if table and not (table[0][0] <= 0 and volume_mL <= table[-1][0]):
        return (
            f"the volume from 0 to {volume_mL:.4g} mL lies outside the burette's error table, "
            f"which goes from {table[0][0]:g} to {table[-1][0]:g} mL."
        )
    if capacity is not None and volume_mL > capacity:
        return f"the end point at {volume_mL:.4g} mL is more than the burette holds, {capacity:g}."
    return None


def taken_of(record: BenchRecord, constants: Constants) -> tuple[TakenCurve, ...]:
    """Return what an evaluation keeps of a record's curves.

    Raises:
        RecordProblem: as ``read_curves``.
    """
    return tuple(one.as_taken() for one in read_curves(record, constants))


def read_taken(documents: Sequence[Mapping[str, Any]]) -> tuple[TakenCurve, ...]:
    """Return the curves that a snapshot holds."""
    return tuple(TakenCurve(**one) for one in documents)
