"""End points from slopes: the steepest segment, the first and the second derivative."""

from dataclasses import dataclass
from itertools import pairwise

import numpy as np

from server.curves.jumps import CleanCurve, slopes
from server.curves.outcome import CannotTell, EndPoint
from server.curves.points import Floats

_STEEP = 1 / 6
"""The first derivative looks at the points where the slope is at least this much of its maximum."""


_WIDEST_HALF = 8
"""The second derivative is smoothed over at most twice this many points and one."""
_QUIET = 0.25
"""The scatter may move the crossing by this fraction of the distance it is interpolated over."""
_MAY = 2.0
"""A segment may be the steepest if its slope comes within twice the difference's scatter."""


def difference_columns(V: Floats, y: Floats) -> tuple[Floats, Floats, Floats, Floats]:
    """Return mid volumes, first differences, mid volumes of those, and second differences.

    The columns as textbooks print them: each slope stands at the middle of its segment, each
    second difference at the middle between two slopes; spacing may be uneven.
    """
    middle, first = (V[1:] + V[:-1]) / 2, slopes(V, y)
    between = (middle[1:] + middle[:-1]) / 2
    return middle, first, between, np.asarray(np.diff(first) / np.diff(middle))


def steepest_segment(clean: CleanCurve, jump: int) -> EndPoint:
    """Return the middle of a curve's steepest segment; u is half its width over sqrt(3).

    Where the scatter makes several segments equally likely to be the steepest, u is that of the
    whole run of them.
    """
    V = clean.V
    low, high = _likely_steepest(clean, jump)
    width = float(V[high + 1] - V[low])
    says = "Read off the raw points: it can only fall on the middle of a step, here "
    says += f"{float(V[jump + 1] - V[jump]):.3g} mL wide."
    if high > low:
        says += f" The scatter leaves open which of {high - low + 1} steps is the steepest."
    if clean.bubbles:
        says += " Readings thrown off by bubbles were left out."
    middle = clean.middle(jump)
    # the middle need not be that of the run: the farther end counts
    reach = max(float(V[high + 1]) - middle, middle - float(V[low]), width / 2)
    used = clean.at[jump : jump + 2]
    return EndPoint("steepest segment", middle, reach / 3**0.5, used, says)


def _likely_steepest(clean: CleanCurve, jump: int) -> tuple[int, int]:
    """Return the first and last segment of the jump that may be the steepest for the scatter."""
    slope = slopes(clean.V, clean.y)
    noise = 2**0.5 * clean.scatter / np.diff(clean.V)
    may = slope + _MAY * np.hypot(noise, noise[jump]) >= slope[jump]
    first, last = _broad_part(slope, jump)
    likely = first + np.flatnonzero(may[first : last + 1])
    return int(likely.min()), int(likely.max())


def _broad_part(slope: Floats, jump: int) -> tuple[int, int]:
    """Return the run of segments around a jump whose slope, of three together, is half of its."""
    three = np.convolve(slope, np.full(3, 1 / 3), mode="same")
    low = high = jump
    while low > 0 and three[low - 1] >= three[jump] / 2:
        low -= 1
    while high < slope.size - 1 and three[high + 1] >= three[jump] / 2:
        high += 1
    return low, high


def second_derivative(clean: CleanCurve, jump: int) -> EndPoint:
    """Return where the second derivative crosses zero beside the steepest slope, interpolated.

    Over the four points of the jump these are the second differences of the textbooks; where the
    scatter would drown them, local parabolas over more points take their place.

    Raises:
        CannotTell: the steepest slope stands at the end of the points.
    """
    _refuse_the_ends(clean.V, jump)
    found = _zero_crossing(clean, jump, 1)
    if found is None or found.noise_mL > _QUIET * found.apart_mL:
        first, last = _broad_part(slopes(clean.V, clean.y), jump)
        # as many neighbours as the jump itself has, and no more: others would blur it
        half = min((last - first + 1) // 2, _WIDEST_HALF)
        found = (_zero_crossing(clean, jump, half) if half > 1 else None) or found
    if found is None:
        raise CannotTell("The second derivative does not change sign at the jump.")
    says = (
        "Where the second derivative changes sign, by interpolation "
        f"between {found.low_mL:.3f} and {found.low_mL + found.apart_mL:.3f} mL; "
        "it makes the scatter of the readings larger."
    )
    if found.half > 1:
        says += f" Smoothed over {2 * found.half + 1} points because of the scatter."
    used = clean.at[found.first : found.last + 1]
    return EndPoint("second derivative", found.volume_mL, found.u_mL, used, says)


@dataclass(frozen=True, slots=True)
class _Crossing:
    """A sign change of the second derivative between two places ``apart_mL`` from each other."""

    volume_mL: float
    noise_mL: float
    low_mL: float
    apart_mL: float
    half: int
    first: int
    last: int

    @property
    def u_mL(self) -> float:
        """Standard uncertainty: the scatter, and a quarter of the distance interpolated over."""
        return float(np.hypot(self.noise_mL, self.apart_mL / 4))


def _curvature(clean: CleanCurve, at: int, half: int) -> tuple[float, float, float]:
    """Return place, second derivative and its standard deviation about a point.

    With one neighbour on each side it is the second difference and stands midway between the two
    slopes; with more it is the least-squares parabola's and stands at the mean volume.
    """
    low, high = at - half, at + half + 1
    V, y = clean.V[low:high], clean.y[low:high]
    if half == 1:
        place = float(V[0] + 2 * V[1] + V[2]) / 4
        before, after = V[1] - V[0], V[2] - V[1]
        weights = np.array([1 / before, -1 / before - 1 / after, 1 / after]) / ((V[2] - V[0]) / 2)
    else:
        place = float(V.mean())
        weights = 2 * np.linalg.pinv(np.vander(V - place, 3, increasing=True))[2]
    return place, float(weights @ y), float(np.linalg.norm(weights)) * clean.scatter


def _zero_crossing(clean: CleanCurve, jump: int, half: int) -> _Crossing | None:
    """Return the sign change nearest the middle of the jump, None where there is none in reach."""
    reach = half + 1
    low, high = jump + 1 - reach, jump + reach
    if low - half < 0 or high + half >= clean.V.size:
        return None
    places = range(low, high + 1)
    seen = [_curvature(clean, at, half) for at in places]
    middle = float(clean.V[jump] + clean.V[jump + 1]) / 2
    best: _Crossing | None = None
    for at, (before, after) in zip(places, pairwise(seen), strict=False):
        if not before[1] > 0 >= after[1]:
            continue
        apart, fall = after[0] - before[0], before[1] - after[1]
        volume = before[0] + apart * before[1] / fall
        noise = apart / fall * float(np.hypot(before[2], after[2])) / 2**0.5
        one = _Crossing(volume, noise, before[0], apart, half, at - half, at + 1 + half)
        if best is None or abs(volume - middle) < abs(best.volume_mL - middle):
            best = one
    return best


def _refuse_the_ends(V: Floats, jump: int) -> None:
    if jump < 1 or jump + 3 > V.size:
        raise CannotTell(
            "The steepest place lies at the end of the points: more are needed beyond it."
        )


def first_derivative(clean: CleanCurve, jump: int) -> EndPoint:
    """Return where a local cubic of volume on reading has its steepest reading.

    The inverse of the curve is far smoother across the jump than the curve itself, so the cubic
    is laid through volume as a function of reading; the place of the greatest slope is the same.

    Raises:
        CannotTell: the jump lies at the end of the points or is not shaped like one.
    """
    V, y = clean.V, clean.y
    _refuse_the_ends(V, jump)
    window = _steep_part(clean, jump)
    v, r = V[window], y[window]
    centre, scale = float((y[jump] + y[jump + 1]) / 2), float(np.ptp(r)) / 2
    if scale <= 0:
        raise CannotTell("The readings do not change where the curve should jump.")
    x = (r - centre) / scale
    inverse = 1 / np.maximum(np.gradient(y, V)[window], 1e-9)
    step = float(V[jump + 1] - V[jump])
    sigma = np.hypot(inverse * clean.scatter, step / 50)
    design = np.vander(x, 4, increasing=True) / sigma[:, None]
    pull, *_ = np.linalg.lstsq(design, v / sigma, rcond=None)
    volume = _inflection(pull, x)
    if volume is None:
        simple = second_derivative(clean, jump)
        says = (
            "The points of the jump are too few for a local cubic; a parabola through the three "
            "steepest slopes instead."
        )
        return EndPoint("first derivative", simple.volume_mL, simple.u_mL, simple.used, says)
    covariance = np.linalg.pinv(design.T @ design)
    gradient = np.zeros(4)
    for at in range(4):
        moved = pull.copy()
        moved[at] += 1e-4 * covariance[at, at] ** 0.5
        there = _inflection(moved, x)
        gradient[at] = ((there or volume) - volume) / (1e-4 * covariance[at, at] ** 0.5)
    noise = float(gradient @ covariance @ gradient)
    u = (noise + (step / 12) ** 2) ** 0.5
    says = (
        f"Steepest place of a local cubic through the {v.size} points of the jump; the steepest "
        "place is not quite the equivalence point."
    )
    used = tuple(np.asarray(clean.at)[window].tolist())
    return EndPoint("first derivative", volume, u, used, says)


def _steep_part(clean: CleanCurve, jump: int) -> slice:
    """Return the run of points around a jump where the slope is a fair part of its maximum."""
    slope = slopes(clean.V, clean.y)
    least = _STEEP * slope[jump]
    low, high = jump, jump + 1
    while low > 0 and slope[low - 1] >= least:
        low -= 1
    while high < clean.V.size - 1 and slope[high] >= least:
        high += 1
    low, high = min(low, jump - 1), max(high, jump + 2)
    return slice(max(low, 0), min(high, clean.V.size - 1) + 1)


def _inflection(pull: Floats, x: Floats) -> float | None:
    """Return the cubic's value where its second derivative is zero, None where that is no jump."""
    _, b, c, d = pull.tolist()
    if d <= 0:
        return None
    at = -c / (3 * d)
    if not x.min() <= at <= x.max() or b + 2 * c * at + 3 * d * at * at <= 0:
        return None
    return float(np.polynomial.polynomial.polyval(at, pull))
