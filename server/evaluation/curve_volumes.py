"""From end points on curves to the volumes of a bench record."""

from collections.abc import Sequence
from dataclasses import replace

from server.evaluation.bench_record import BenchRecord
from server.evaluation.record_fields import RecordProblem
from server.evaluation.replicate_reading import Replicate
from server.evaluation.taken_curve import TakenCurve


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
