"""The curves of a bench result: what every method answers, and the concentration it would give."""

from collections.abc import Mapping, Sequence
from dataclasses import replace
from math import isfinite
from typing import Any

from server.evaluation.bench_record import BenchRecord
from server.evaluation.curve_volumes import at_volume, outside_burette
from server.evaluation.methods.model_v1 import Model
from server.evaluation.taken_curve import TakenCurve


def method_rows(
    record: BenchRecord, model: Model, curves: Sequence[TakenCurve]
) -> list[dict[str, Any]]:
    """Return each curve with every method's answer and value in mol/L, in order of replicates."""
    return [_row(record, model, one) for one in curves]


def _row(record: BenchRecord, model: Model, curve: TakenCurve) -> dict[str, Any]:
    held = curve.found
    row: dict[str, Any] = {
        "label": curve.label,
        "replicate": curve.index,
        "excluded": record.replicates[curve.index].excluded,
        "taken": curve.taken,
        "proposed": curve.proposed,
        "stated": curve.stated,
        "system": curve.system,
        "flask_assumed": curve.flask_assumed,
        "volume_mL": curve.volume_mL,
        "u_shared_mL": curve.u_shared_mL,
        "u_own_mL": curve.u_own_mL,
        "kind": held["kind"],
        "direction": held["direction"],
        "points": held["points"],
        "methods": list(held["methods"]),
        "fit": held["fit"],
        "findings": list(held["findings"]),
        "values": values_of(record, model, curve),
    }
    if held.get("other_step"):
        row["other_step"] = list(held["other_step"])
    return row


def values_of(record: BenchRecord, model: Model, curve: TakenCurve) -> dict[str, float]:
    """Return the concentration in mol/L that each method's volume gives, where it gives one."""
    found = {}
    for answer in curve.found["methods"]:
        value = _value(record, model, curve, answer)
        if value is not None:
            found[str(answer["method"])] = value
    return found


def _value(
    record: BenchRecord, model: Model, curve: TakenCurve, answer: Mapping[str, Any]
) -> float | None:
    one, volume = record.replicates[curve.index], answer.get("volume_mL")
    if volume is None or outside_burette(record, one, volume) is not None:
        return None
    taken = replace(curve, taken=answer["method"], volume_mL=volume)
    portion = model.portion(at_volume(one, taken))
    if (record.weighs_each and portion.mass_g is None) or model.volume(portion) <= 0:
        return None
    value = model.concentration(portion)
    return value if isfinite(value) else None
