"""The curve without what was thrown off, and where it jumps."""

from dataclasses import dataclass

import numpy as np

from server.curves.bubbles import scatter_of, thrown_off
from server.curves.points import Floats, TitrationCurve

_SMALLER_JUMP = 0.08
"""An earlier jump counts from this fraction of the steepest slope on."""
_VALLEY = 0.45
"""Between two jumps and beyond each, the slope falls below this fraction of the smaller one."""
_CLEAR_OF_SCATTER, _MAIN_CLEAR = 6.0, 2.0
"""How many standard deviations a slope must stand out: that of another jump, of the steepest."""


@dataclass(frozen=True, slots=True, eq=False)
class CleanCurve:
    """Rising readings at strictly growing volumes, bubbles left out.

    ``at`` gives each point's index in the curve as it was read; of several readings at one volume
    the last stands (the probe had the longest time). ``scatter`` is the standard deviation of a
    reading, ``bubbles`` the indices left out.
    """

    V: Floats
    y: Floats
    at: tuple[int, ...]
    scatter: float
    bubbles: tuple[int, ...]

    def middle(self, segment: int) -> float:
        """Return the volume in the middle of the segment that begins at a point, in mL."""
        return float(self.V[segment] + self.V[segment + 1]) / 2


def cleaned(curve: TitrationCurve) -> CleanCurve:
    """Return the curve without bubbles and repeated volumes, turned so that it rises."""
    y = curve.rising
    bubbles = thrown_off(curve.V, y, kind=curve.kind)
    keep = np.ones(curve.size, dtype=bool)
    keep[bubbles] = False
    at = np.flatnonzero(keep)
    at = at[np.append(np.diff(curve.V[at]) > 0, True)]
    V, y = curve.V[at], y[at]
    return CleanCurve(V, y, tuple(at.tolist()), scatter_of(V, y), tuple(bubbles))


def slopes(V: Floats, y: Floats) -> Floats:
    """Return the slope of each segment between neighbouring points."""
    return np.asarray(np.diff(y) / np.diff(V))


def jumps(clean: CleanCurve) -> list[int]:
    """Return the segments at which the curve jumps, in order of volume; the steepest is among them.

    An earlier or later jump counts where the slope falls off on both sides of it and it stands
    clear of the scatter. A steep beginning or end is no jump.
    """
    V, y = clean.V, clean.y
    slope = slopes(V, y)
    noise = clean.scatter * np.sqrt(2) / np.diff(V)
    clear = slope - _CLEAR_OF_SCATTER * noise
    main = int(np.argmax(slope - _MAIN_CLEAR * noise))
    earlier = _next_jump(slope[:main][::-1], clear[:main][::-1], main_slope=float(slope[main]))
    later = _next_jump(slope[main + 1 :], clear[main + 1 :], main_slope=float(slope[main]))
    found = [main]
    if earlier is not None:
        found.insert(0, main - 1 - earlier)
    if later is not None:
        found.append(main + 1 + later)
    return found


def _next_jump(slope: Floats, clear: Floats, *, main_slope: float) -> int | None:
    """Return the steepest other jump, walking away from the steepest of all; None: there is none.

    It has a valley before it and one beyond, so that a steep beginning or end does not count.
    """
    if slope.size < 5:
        return None
    valley = np.minimum.accumulate(np.maximum(slope, 0.0))
    stands = (slope >= _SMALLER_JUMP * main_slope) & (valley <= _VALLEY * slope) & (clear > valley)
    if not stands.any():
        return None
    best = int(np.argmax(np.where(stands, slope, -np.inf)))
    beyond = slope[best + 1 :]
    if beyond.size < 2 or float(np.median(beyond[-5:])) > _VALLEY * slope[best]:
        return None
    return best


def steepest_about(clean: CleanCurve, volume_mL: float) -> int | None:
    """Return the steepest segment within a tenth of a volume; None where no points lie there."""
    middles = (clean.V[1:] + clean.V[:-1]) / 2
    near = np.abs(middles - volume_mL) <= 0.1 * volume_mL
    if not near.any():
        return None
    return int(np.argmax(np.where(near, slopes(clean.V, clean.y), -np.inf)))
