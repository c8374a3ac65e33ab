"""Readings that a bubble or a knock has thrown far off the curve."""

import numpy as np

from server.curves.points import Floats

_REACH = 2
"""Neighbours looked at on each side."""
_LIMIT = 12.0
"""How many times the scatter a reading must stand off to be called thrown off."""
_CLEAR = {"pH": 0.15, "mV": 9.0}
"""No reading nearer than this is called thrown off, whatever the scatter."""


def thrown_off(V: Floats, y: Floats, *, kind: str) -> list[int]:
    """Return the indices of readings that stand far off the median of their neighbours.

    On a curve that only rises or only falls a reading is the median of itself and its neighbours
    however steep it is, so that the end point's jump is never mistaken for a bubble. The worst is
    taken first and the rest judged again without it. At most one reading in eight is taken.
    """
    limit = max(_LIMIT * scatter_of(V, y), _CLEAR[kind])
    keep = np.arange(y.size)
    gone: list[int] = []
    for _ in range(y.size // 8):
        off = np.abs(_off_the_median(y[keep]))
        worst = int(np.argmax(off))
        if off[worst] <= limit:
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

    From each reading's distance to the straight line and to the cubic through its neighbours,
    whichever is smaller, by the median, so that the jump and a few bubbles do not count.
    """
    return min(_about(V, y, 1), _about(V, y, 2))


def _about(V: Floats, y: Floats, reach: int) -> float:
    """Return the scatter about the polynomial through ``reach`` neighbours on each side."""
    size = V.size - 2 * reach
    starts = [at for at in range(2 * reach + 1) if at != reach]
    places = [V[at : at + size] for at in starts]
    middle = V[reach : reach + size]
    # two readings at one volume leave no line between them: such places do not count
    with np.errstate(divide="ignore", invalid="ignore"):
        shares = np.array(
            [
                np.prod([(middle - o) / (p - o) for o in places if o is not p], axis=0)
                for p in places
            ]
        )
        readings = np.array([y[at : at + size] for at in starts])
        off = y[reach : reach + size] - (shares * readings).sum(axis=0)
        spread = np.sqrt(1 + np.square(shares).sum(axis=0))
    usable = np.isfinite(spread) & np.isfinite(off)
    if not usable.any():
        return 0.0
    return 1.4826 * float(np.median(np.abs(off[usable] / spread[usable])))
