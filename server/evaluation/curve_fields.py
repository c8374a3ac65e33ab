"""The curve of a replicate and the end point that a bench record asks of its curves, as fields."""

from collections.abc import Sequence
from dataclasses import dataclass
from math import isfinite
from typing import Any

from server.curves.model.systems import SYSTEM_NAMES
from server.curves.outcome import METHODS
from server.curves.points import FEWEST_POINTS
from server.evaluation.record_fields import Fields, RecordProblem, decimal_at, value_of
from server.lab.curve_entry import MOST_POINTS
from server.metrology.quantity import Quantity

_SPANS = {
    # wide enough for any probe and burette: what lies outside is no reading of one
    "volume_mL": (0.0, 10_000.0, "mL"),
    "pH": (-5.0, 20.0, "pH"),
    "mV": (-10_000.0, 10_000.0, "mV"),
    "seconds": (0.0, 1e7, "s"),
}
_EXAMPLES = {"volume_mL": '"12.35"', "pH": '"7.00"', "mV": '"-12.5"', "seconds": '"30"'}


@dataclass(frozen=True, slots=True)
class Curve:
    """A titration curve: volumes in mL, readings as pH or mV, seconds where they were kept.

    ``drop`` is the calibrated volume of one drop where drops were counted: its relative u is one
    and the same in all volumes, and no burette was read.
    """

    kind: str
    volume_mL: tuple[float, ...]
    reading: tuple[float, ...]
    seconds: tuple[float, ...] | None
    method: str | None
    drop: Quantity | None = None


@dataclass(frozen=True, slots=True)
class AskedEndPoint:
    """How the record wants its curves read: method, system, mL in the flask; None: not told."""

    method: str | None
    system: str | None
    flask_volume_mL: float | None


def read_end_point(top: Fields) -> AskedEndPoint | None:
    """Return how a record wants its curves read, None where it does not say.

    Raises:
        RecordProblem: a method or system that is not known, or a volume that cannot be.
    """
    if not top.has("end_point"):
        return None
    keys = ("method", "system", "flask_volume")
    fields = Fields(top.document["end_point"], "end_point", keys)
    volume = fields.need_quantity("flask_volume", "mL") if fields.has("flask_volume") else None
    return AskedEndPoint(
        method=fields.choice("method", METHODS) if fields.has("method") else None,
        system=fields.choice("system", SYSTEM_NAMES) if fields.has("system") else None,
        flask_volume_mL=None if volume is None else value_of(volume),
    )


def read_curve(fields: Fields, *, counts: bool) -> Curve | None:
    """Return a replicate's curve, None where it has none.

    The curve of a replicate that was left out (``counts`` false) may be short or go back.

    Raises:
        RecordProblem: points that make no curve, each named by its path.
    """
    if not fields.has("curve"):
        fields.text("method", '"model fit"', required=False)
        return None
    method = fields.choice("method", METHODS) if fields.has("method") else None
    curve = Fields(fields.document["curve"], fields.at("curve"), (*_SPANS, "drop"))
    if curve.has("pH") == curve.has("mV"):
        curve.refuse("pH", "A curve has readings in pH or in mV.", '"pH": ["3.91", "4.02"]')
    kind = "pH" if curve.has("pH") else "mV"
    volume, reading = _numbers(curve, "volume_mL"), _numbers(curve, kind)
    seconds = _numbers(curve, "seconds") if curve.has("seconds") else None
    for key, values in ((kind, reading), ("seconds", seconds or volume)):
        if len(values) != len(volume):
            curve.refuse(key, f"{len(values)} values for {len(volume)} volumes.", None)
    if counts:
        _check(curve, kind, volume, reading, seconds)
    drop = curve.need_quantity("drop", "mL") if curve.has("drop") else None
    return Curve(kind, volume, reading, seconds, method, drop)


def _numbers(curve: Fields, key: str) -> tuple[float, ...]:
    rows, example = curve.need(key, '["0.00", "0.50"]'), '["0.00", "0.50"]'
    if not isinstance(rows, Sequence) or isinstance(rows, str) or not rows:
        curve.refuse(key, "This must be a list of values.", example)
    if len(rows) > MOST_POINTS:
        says = f"A curve is read with at most {MOST_POINTS} points; here are {len(rows)}."
        curve.refuse(key, says, example)
    return tuple(_number(one, f"{curve.at(key)}[{i}]", key) for i, one in enumerate(rows))


def _number(value: Any, path: str, key: str) -> float:
    """Return a point's value; a meter's file may hold numbers, a person types text."""
    low, high, unit = _SPANS[key]
    if isinstance(value, int | float) and not isinstance(value, bool):
        # an integer may be longer than any float
        number = float(value) if abs(value) < 1e12 else float("inf")
    else:
        number = decimal_at(value, path, _EXAMPLES[key].strip('"'))
    if not isfinite(number) or not low <= number <= high:
        says = f"{str(value)[:40]} is no reading: it must lie between {low:g} and {high:g} {unit}."
        raise RecordProblem(path, says, _EXAMPLES[key])
    return number


def _check(
    curve: Fields,
    kind: str,
    volume: tuple[float, ...],
    reading: tuple[float, ...],
    seconds: tuple[float, ...] | None,
) -> None:
    if len(volume) < FEWEST_POINTS or len(set(volume)) < FEWEST_POINTS:
        says = (
            f"A curve needs at least {FEWEST_POINTS} points at different volumes; here are "
            f"{len(set(volume))}."
        )
        curve.refuse("volume_mL", says, None)
    _never_back(curve, "volume_mL", volume)
    if seconds is not None:
        _never_back(curve, "seconds", seconds)
    if min(reading) == max(reading):
        curve.refuse(kind, "All readings are the same: there is no curve to look at.", None)


def _never_back(curve: Fields, key: str, values: tuple[float, ...]) -> None:
    for at in range(1, len(values)):
        if values[at] < values[at - 1]:
            word = "volume" if key == "volume_mL" else "time"
            says = (
                f"The {word} goes back at point {at + 1}: {values[at]:g} after "
                f"{values[at - 1]:g}. Strike the wrong one of the two."
            )
            curve.refuse(f"{key}[{at}]", says, None)
