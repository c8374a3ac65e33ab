"""Drying of a standard: what was recorded against what its certificate asks for."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from datetime import datetime, timedelta
from decimal import Decimal
from typing import Any

from server.lab import reading_documents as reading
from server.lab.calibration.check import Check
from server.lab.calibration.typed_numbers import number_at, optional_number
from server.lab.refusal import Unacceptable
from server.metrology.conformity import Verdict

_BASIS = "certificate of the standard lot: drying"
_DEMAND_KEYS = ("low_C", "high_C", "hours", "hours_most", "desiccator", "oven", "good_for_hours")


@dataclass(frozen=True, slots=True)
class DryingDemand:
    """What a certificate asks for: °C from low to high, hours, cooling in a desiccator.

    ``oven`` False forbids an oven (borax, oxalic acid dihydrate); ``good_for_hours`` is how long
    the dried standard may be used, where somebody says so.
    """

    low_C: Decimal | None
    high_C: Decimal | None
    hours: Decimal | None
    hours_most: Decimal | None
    desiccator: bool
    oven: bool
    good_for_hours: Decimal | None

    @property
    def words(self) -> str:
        """The demand as one would say it."""
        if not self.oven:
            return "no oven"
        parts = [] if self.low_C is None else [f"{self.low_C} to {self.high_C} °C"]
        if self.hours is not None:
            most = f" to {self.hours_most}" if self.hours_most is not None else ""
            parts.append(f"{self.hours}{most} h")
        if self.desiccator:
            parts.append("cooled in a desiccator")
        return ", ".join(parts) or "nothing stated"


@dataclass(frozen=True, slots=True)
class Drying:
    """One entry of the log: °C and hours (None: no oven), desiccator or not, when it ended."""

    temperature_C: Decimal | None
    hours: Decimal | None
    desiccator: bool
    ended_at: datetime


def read_demand(document: Any, path: str = "drying_demand") -> DryingDemand:
    """Return a certificate's demand; numbers are text.

    Keys: ``low_C`` and ``high_C`` (both or neither), ``hours``, ``hours_most``, ``desiccator``,
    ``oven`` (false: never), ``good_for_hours``.

    Raises:
        Unacceptable: an unknown key, or bounds that do not rise.
    """
    doc = reading.known_keys(document, path, _DEMAND_KEYS)
    low, high = (_degrees(doc, key, path) for key in ("low_C", "high_C"))
    if (low is None) != (high is None):
        absent = "low_C" if low is None else "high_C"
        says = f"{path}.{absent} is missing: the drying temperature has two ends."
        raise Unacceptable(says, field=f"{path}.{absent}", example="120")
    hours, most, good_for = (_hours(doc, key, path) for key in _DEMAND_KEYS[2:4] + _DEMAND_KEYS[6:])
    for first, second, key in ((low, high, "high_C"), (hours, most, "hours_most")):
        if first is not None and second is not None and first > second:
            says = f"{path}.{key} must not be less than where it begins."
            raise Unacceptable(says, field=f"{path}.{key}")
    oven = reading.truth_at(doc, "oven", path, default=True)
    desiccator = reading.truth_at(doc, "desiccator", path, default=False)
    return DryingDemand(low, high, hours, most, desiccator, oven, good_for)


def read_drying(document: Any, ended_at: datetime, path: str = "drying") -> Drying:
    """Return one entry of the log: ``temperature`` °C and ``hours`` as text, ``desiccator``.

    Raises:
        Unacceptable: an unknown key, one of temperature and hours alone.
    """
    doc = reading.known_keys(document, path, ("temperature", "hours", "desiccator"))
    temperature = _degrees(doc, "temperature", path)
    hours = _hours(doc, "hours", path)
    if (temperature is None) != (hours is None):
        absent = "temperature" if temperature is None else "hours"
        where = f"{path}.{absent}" if path else absent
        says = f"{where} is missing: an oven has a temperature and a time."
        raise Unacceptable(says, field=where, example="120" if temperature is None else "2")
    desiccator = reading.truth_at(doc, "desiccator", path, default=False)
    return Drying(temperature, hours, desiccator, ended_at)


def judge_drying(demand: DryingDemand, log: Sequence[Drying], *, used_at: datetime) -> Check:
    """Return whether the last drying before the use met the demand.

    It *fails* where nothing was recorded, too cold, too hot, too short, or too long ago; it is
    *looked at* where only the desiccator is missing.
    """
    before = [one for one in log if one.ended_at <= used_at]
    last = max(before, key=lambda one: one.ended_at, default=None)
    if not demand.oven:
        hot = last is not None and last.temperature_C is not None
        says = "It was in an oven, which its certificate forbids." if hot else "No oven, as asked."
        return _check("fails" if hot else "holds", says, demand, last)
    if last is None:
        return _check("fails", "No drying is recorded before this use.", demand, None)
    short = _shortfalls(demand, last, used_at)
    if short:
        return _check("fails", f"Dried, but {'; '.join(short)}.", demand, last)
    if demand.desiccator and not last.desiccator:
        says = "Dried as asked, but no desiccator is recorded for cooling."
        return _check("look", says, demand, last)
    return _check("holds", "Dried as its certificate asks.", demand, last)


def _shortfalls(demand: DryingDemand, last: Drying, used_at: datetime) -> list[str]:
    found = []
    t, hours = last.temperature_C, last.hours
    if demand.low_C is not None and demand.high_C is not None:
        if t is None:
            found.append("not in an oven")
        elif t < demand.low_C:
            found.append(f"{t} °C is less than {demand.low_C} °C")
        elif t > demand.high_C:
            found.append(f"{t} °C is more than {demand.high_C} °C")
    if demand.hours is not None and (hours is None or hours < demand.hours):
        found.append(f"{hours or 0} h are less than {demand.hours} h")
    if demand.hours_most is not None and hours is not None and hours > demand.hours_most:
        found.append(f"{hours} h are more than {demand.hours_most} h")
    if demand.good_for_hours is not None:
        stood = used_at - last.ended_at
        if stood > timedelta(hours=float(demand.good_for_hours)):
            found.append(f"it stood {stood.total_seconds() / 3600:.0f} h since")
    return found


def _check(verdict: Verdict, says: str, demand: DryingDemand, last: Drying | None) -> Check:
    done = "none"
    if last is not None:
        oven = (
            f"{last.temperature_C} °C, {last.hours} h"
            if last.temperature_C is not None
            else "no oven"
        )
        done = f"{oven}{', desiccator' if last.desiccator else ''}"
    return Check(
        name="drying", verdict=verdict, says=says, basis=_BASIS, figure_text=done,
        limit_text=demand.words,
    )  # fmt: skip


def _degrees(doc: Mapping[str, Any], key: str, path: str) -> Decimal | None:
    return optional_number(doc, key, path, example="120", low="0", high="1200")


def _hours(doc: Mapping[str, Any], key: str, path: str) -> Decimal | None:
    if doc.get(key) in (None, ""):
        return None
    return number_at(doc, key, path, example="2", low="0", high="100000")
