"""The points of a titration curve: volumes, readings, seconds; what makes them a curve."""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal, Protocol

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Kind = Literal["pH", "mV"]
Direction = Literal["rising", "falling"]

FEWEST_POINTS = 6


class CurveProblem(ValueError):
    """Points that make no curve: what is wrong, in words, and at which point (counted from 0).

    ``field`` names what was given beside the points, where that is wrong.
    """

    def __init__(self, says: str, *, index: int | None = None, field: str | None = None) -> None:
        super().__init__(says)
        self.says = says
        self.index = index
        self.field = field


class PointsLike(Protocol):
    """Anything that carries a curve: volumes in mL, readings, seconds where they were kept."""

    @property
    def kind(self) -> str:
        """What was read, ``pH`` or ``mV``."""

    @property
    def volume_mL(self) -> Sequence[float]:
        """The volumes in mL, in the order of reading."""

    @property
    def reading(self) -> Sequence[float]:
        """The readings, in pH or mV."""

    @property
    def seconds(self) -> Sequence[float] | None:
        """The times in seconds, where they were kept."""


@dataclass(frozen=True, slots=True)
class Points:
    """A curve as typed values: the shape in which intake hands it over."""

    kind: str
    volume_mL: tuple[float, ...]
    reading: tuple[float, ...]
    seconds: tuple[float, ...] | None = None


@dataclass(frozen=True, slots=True, eq=False)
class TitrationCurve:
    """A curve that has been looked at: arrays of equal length, volumes never going back."""

    kind: Kind
    V: Floats
    y: Floats
    seconds: Floats | None

    @property
    def size(self) -> int:
        """How many points there are."""
        return int(self.V.size)

    @property
    def direction(self) -> Direction:
        """Whether the readings rise or fall from the first to the last volume."""
        third = max(2, self.size // 4)
        low, high = np.median(self.y[:third]), np.median(self.y[-third:])
        return "rising" if high >= low else "falling"

    @property
    def rising(self) -> Floats:
        """The readings with their sign turned where they fall: always rising."""
        return self.y if self.direction == "rising" else -self.y


def titration_curve(points: PointsLike) -> TitrationCurve:
    """Return the points as a curve.

    Raises:
        CurveProblem: fewer than 6 points, unequal lengths, values that are not finite, volumes or
            seconds that go back, a kind of reading that is not known, or readings all alike.
    """
    if points.kind not in ("pH", "mV"):
        raise CurveProblem(f"Readings are in pH or in mV, not in {points.kind!r}.")
    kind: Kind = "pH" if points.kind == "pH" else "mV"
    V, y = np.asarray(points.volume_mL, float), np.asarray(points.reading, float)
    t = None if points.seconds is None else np.asarray(points.seconds, float)
    if V.size != y.size or (t is not None and t.size != V.size):
        raise CurveProblem("Volumes, readings and seconds must be equally many.")
    if V.size < FEWEST_POINTS:
        says = f"A curve needs at least {FEWEST_POINTS} points; here are {V.size}."
        raise CurveProblem(says)
    named = [("volume", V), ("reading", y), *([("time", t)] if t is not None else [])]
    for name, values in named:
        bad = np.flatnonzero(~np.isfinite(values))
        if bad.size:
            at = int(bad[0])
            raise CurveProblem(f"The {name} of point {at + 1} is not a number.", index=at)
    _never_back("volume", V)
    if t is not None:
        _never_back("time", t)
    if np.ptp(y) == 0:
        raise CurveProblem("All readings are the same: there is no curve to look at.")
    if np.unique(V).size < FEWEST_POINTS:
        says = f"A curve needs at least {FEWEST_POINTS} different volumes."
        raise CurveProblem(says)
    return TitrationCurve(kind=kind, V=V, y=y, seconds=t)


def _never_back(name: str, values: Floats) -> None:
    back = np.flatnonzero(np.diff(values) < 0)
    if back.size:
        at = int(back[0]) + 1
        says = (
            f"The {name} goes back at point {at + 1}: {values[at]:g} after {values[at - 1]:g}. "
            "Strike the wrong one of the two."
        )
        raise CurveProblem(says, index=at)
