"""Readings that a bubble or a knock has thrown far off the curve."""

import numpy as np

from server.curves.points import Floats

_REACH = 2
"""Neighbours looked at on each side."""
_LIMIT = 12.0
"""How many times the usual scatter a reading must stand off to be called thrown off."""
_CLEAR = {"pH": 0.15, "mV": 9.0}
"""No reading nearer than this is called thrown off, whatever the scatter."""


def thrown_off(y: Floats, *, kind: str) -> list[int]:
    """Return the indices of readings that stand far off the median of their neighbours.

    On a curve that only rises or only falls a reading is the median of itself and its neighbours
    however steep it is, so that the end point's jump is never mistaken for a bubble. The worst is
    taken first and the rest judged again without it. At most one reading in eight is taken.
    """
    keep = np.arange(y.size)
    gone: list[int] = []
    for _ in range(y.size // 8):
        off = np.abs(_off_the_median(y[keep]))
        scatter = 1.4826 * float(np.median(off[off > 0])) if np.any(off > 0) else 0.0
        worst = int(np.argmax(off))
        if off[worst] <= max(_LIMIT * scatter, _CLEAR[kind]):
            break
        gone.append(int(keep[worst]))
        keep = np.delete(keep, worst)
    return sorted(gone)


def _off_the_median(y: Floats) -> Floats:
    """Return each reading less the median of itself and two neighbours on each side.

    The ends are judged against a straight continuation of what follows or comes before.
    """
    first = [2 * y[0] - y[i] for i in range(_REACH, 0, -1)]
    last = [2 * y[-1] - y[-1 - i] for i in range(1, _REACH + 1)]
    padded = np.concatenate([first, y, last])
    windows = np.lib.stride_tricks.sliding_window_view(padded, 2 * _REACH + 1)
    return np.asarray(y - np.median(windows, axis=1), dtype=float)


def scatter_of(V: Floats, y: Floats) -> float:
    """Return the standard deviation of readings about a smooth curve, in the unit of the readings.

    From each reading's distance to the straight line through its neighbours, by the median, so
    that the jump and a few bubbles do not count.
    """
    span = V[2:] - V[:-2]
    usable = span > 0
    share = (V[1:-1][usable] - V[:-2][usable]) / span[usable]
    off = y[1:-1][usable] - (1 - share) * y[:-2][usable] - share * y[2:][usable]
    spread = np.sqrt(1 + share**2 + (1 - share) ** 2)
    if off.size == 0:
        return 0.0
    return 1.4826 * float(np.median(np.abs(off / spread)))
