"""The replicates of a bench record: what was weighed, and what the burette delivered."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from server.evaluation.curve_fields import Curve, read_curve
from server.evaluation.record_fields import Fields, RecordProblem, Table, pair_at
from server.evaluation.taken_curve import CurveEndPoint

__all__ = ["Curve", "Replicate", "read_replicates"]

_KEYS = frozenset(
    "mass tare_load container_and_standard container_less_standard burette delivered corrected "
    "curve method temperature excluded label minutes".split()
)
_READ_EXAMPLE = '{"burette": [["0.00", "18.64"]]}'


@dataclass(frozen=True, slots=True)
class Replicate:
    """One replicate as read; ``texts`` keeps the readings as typed, by their path within it.

    ``minutes`` is how long it took, where a drift is taken off.

    ``end_point`` is there once a curve was read: ``segments`` then hold its volume.
    """

    label: str
    excluded: str | None
    temperature: float | None
    tared: tuple[float, float] | None
    difference: tuple[float, float] | None
    segments: tuple[tuple[float, float], ...]
    delivered: float | None
    curve: Curve | None
    texts: Mapping[str, str]
    end_point: CurveEndPoint | None = None
    minutes: float | None = None

    @property
    def weighed(self) -> bool:
        """Whether a mass was read."""
        return self.tared is not None or self.difference is not None

    @property
    def measured(self) -> bool:
        """Whether a volume was read, or a curve from which it follows."""
        return bool(self.segments) or self.delivered is not None or self.curve is not None

    @property
    def loads(self) -> tuple[tuple[str, float], ...]:
        """The balance's loads in g, each with its path."""
        if self.difference is not None:
            first, second = self.difference
            return ("container_and_standard", first), ("container_less_standard", second)
        if self.tared is not None:
            mass, tare = self.tared
            return ("tare_load", tare), ("mass", tare + mass)
        return ()


def read_replicates(
    top: Fields, *, weighed: bool, table: Table, capacity: float | None, timed: bool = False
) -> tuple[Replicate, ...]:
    """Return a record's replicates; ``table`` is the burette's error table.

    ``timed``: a drift is taken off, so that each replicate says how many minutes it took.

    Raises:
        RecordProblem: a reading that cannot be, or a required one that is missing.
    """
    rows = top.need("replicates", f"[{_READ_EXAMPLE}]")
    if not isinstance(rows, Sequence) or isinstance(rows, str) or not rows:
        top.refuse("replicates", "At least one replicate is needed.", f"[{_READ_EXAMPLE}]")
    replicates = tuple(_replicate(row, i, table, capacity) for i, row in enumerate(rows))
    for i, one in enumerate(replicates):
        if one.minutes is not None and not timed:
            says = "Minutes count only where the record states a drift."
            raise RecordProblem(f"replicates[{i}].minutes", says)
        if timed and one.minutes is None and one.excluded is None:
            says = "The drift needs the minutes that this titration took."
            raise RecordProblem(f"replicates[{i}].minutes", says, '"2.5"')
        if one.excluded is None:
            _check_complete(one, f"replicates[{i}]", weighed=weighed)
    return replicates


def _replicate(row: Any, index: int, table: Table, capacity: float | None) -> Replicate:
    fields = Fields(row, f"replicates[{index}]", _KEYS)
    tared, difference = _tared(fields), _difference(fields)
    if tared is not None and difference is not None:
        fields.refuse("mass", "State a mass or the two container readings, not both.", '"0.3888"')
    ways = [key for key in ("burette", "delivered", "curve") if fields.has(key)]
    if len(ways) > 1:
        fields.refuse(ways[1], f"Both {ways[0]} and {ways[1]} are stated; keep one.", _READ_EXAMPLE)
    return Replicate(
        label=fields.text("label", '"1"', required=False) or str(index + 1),
        excluded=fields.text("excluded", '"air bubble in the tip"', required=False),
        temperature=fields.decimal("temperature", "20.5"),
        tared=tared,
        difference=difference,
        segments=_segments(fields, table, capacity),
        delivered=_delivered(fields, table),
        curve=read_curve(fields, counts=not fields.has("excluded")),
        texts=_texts(fields),
        minutes=_minutes(fields),
    )


def _check_complete(one: Replicate, path: str, *, weighed: bool) -> None:
    if weighed and not one.weighed:
        says = "The mass of the standard is missing."
        example = '"container_and_standard": "60.5450", "container_less_standard": "60.1562"'
        raise RecordProblem(f"{path}.mass", says, example)
    if not one.measured:
        says = "The burette readings are missing."
        raise RecordProblem(f"{path}.burette", says, '[["0.00", "18.64"]]')


def _minutes(fields: Fields) -> float | None:
    value = fields.decimal("minutes", "2.5")
    if value is not None and value < 0:
        fields.refuse("minutes", "A time cannot be negative.", '"2.5"')
    return value


def _mass(fields: Fields, key: str, example: str) -> float | None:
    value = fields.decimal(key, example)
    if value is not None and value < 0:
        fields.refuse(key, "A mass cannot be negative.", f'"{example}"')
    return value


def _tared(fields: Fields) -> tuple[float, float] | None:
    mass, tare = _mass(fields, "mass", "0.3888"), _mass(fields, "tare_load", "32.1054")
    if mass is None:
        if tare is not None:
            fields.refuse("mass", "A tare load is stated, but no mass.", '"0.3888"')
        return None
    if mass == 0:
        fields.refuse("mass", "The mass is zero: nothing was weighed.", '"0.3888"')
    return mass, tare or 0.0


def _difference(fields: Fields) -> tuple[float, float] | None:
    keys = ("container_and_standard", "container_less_standard")
    first, second = (_mass(fields, key, "60.5450") for key in keys)
    if first is None and second is None:
        return None
    if first is None or second is None:
        absent = keys[0] if first is None else keys[1]
        fields.refuse(absent, "The other reading of this difference is missing.", '"60.1562"')
    if second >= first:
        says = f"{second:g} g is not less than {first:g} g: nothing left the container."
        fields.refuse(keys[1], says, '"60.1562"')
    return first, second


def _segments(
    fields: Fields, table: Table, capacity: float | None
) -> tuple[tuple[float, float], ...]:
    if not fields.has("burette"):
        return ()
    rows = fields.document["burette"]
    if not isinstance(rows, Sequence) or isinstance(rows, str) or not rows:
        fields.refuse("burette", "This must be a list of [start, end] pairs.", _READ_EXAMPLE)
    segments = []
    for i, row in enumerate(rows):
        path = f"{fields.at('burette')}[{i}]"
        start, end = pair_at(row, path, '["0.00", "18.64"]')
        for j, reading in enumerate((start, end)):
            _check_reading(reading, f"{path}[{j}]", table, capacity)
        if end < start:
            says = (
                f"The end, {end:g} mL, is less than the start, {start:g} mL. Was the burette "
                "refilled? Then write a second segment."
            )
            raise RecordProblem(f"{path}[1]", says, '[["0.00", "20.00"], ["0.00", "3.10"]]')
        segments.append((start, end))
    return tuple(segments)


def _check_reading(reading: float, path: str, table: Table, capacity: float | None) -> None:
    if table and not table[0][0] <= reading <= table[-1][0]:
        says = (
            f"{reading:g} mL lies outside the burette's error table, which goes from "
            f"{table[0][0]:g} to {table[-1][0]:g} mL."
        )
        raise RecordProblem(path, says, f'"{table[-1][0] / 2:.2f}"')
    if reading < 0:
        raise RecordProblem(path, "A burette reading cannot be negative.", '"0.00"')
    if capacity is not None and reading > capacity:
        says = f"{reading:g} mL is more than the burette holds, {capacity:g} mL."
        raise RecordProblem(path, says, f'"{capacity / 2:.2f}"')


def _delivered(fields: Fields, table: Table) -> float | None:
    value = fields.decimal("delivered", "18.64")
    corrected = fields.flag("corrected")
    if value is None:
        return None
    if value <= 0:
        fields.refuse("delivered", "The delivered volume must be above zero.", '"18.64"')
    if table and not corrected:
        says = (
            "The burette has an error table, which needs both readings; a net volume is taken "
            'only with "corrected": true.'
        )
        fields.refuse("delivered", says, '"burette": [["0.00", "18.64"]]')
    return value


def _texts(fields: Fields) -> dict[str, str]:
    """Return the readings as typed, by their path within the replicate."""
    found = {
        key: value
        for key, value in fields.document.items()
        if isinstance(value, str) and key not in {"label", "excluded", "method"}
    }
    for i, row in enumerate(fields.document.get("burette") or ()):
        found |= {f"burette[{i}][{j}]": text for j, text in enumerate(row)}
    return found
