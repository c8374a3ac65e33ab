"""Gran's straight lines before and beyond an equivalence point.

G. Gran, Analyst 77 (1952) 661: a function of volume and pH that is linear in the volume and zero at
the equivalence point. Before it, V 10^(-pH) for a weak acid with a strong base and
(V0 + V) 10^(-pH) for a strong one; beyond it, (V0 + V) 10^(pH); with an acid as titrant the signs
of pH turn round. A reading's scatter is the same everywhere, so a point's weight is one over the
square of the line there.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from server.curves.jumps import CleanCurve
from server.curves.outcome import CannotTell, EndPoint, Method
from server.curves.points import Floats

_LN10 = float(np.log(10))
_FEWEST = 4
_NEAR, _FAR = 0.01, 0.5
"""Fractions of the equivalence volume between which points before it are taken."""
_NEAR_BEYOND = 0.003
_UNSEEN = 0.001
"""What activity, carbonate and the electrode may shift a line by without bending it, as u over the
volume: 0.1 to 0.2 % in simulated curves of phthalate, TRIS and carbonate."""
_UNSEEN_IN_LYE = 0.005
"""The same beyond the end point of an alkaline titrant, whose carbonate (up to 1.4 % of it) shifts
the line by as much as 1 % where readings are few."""
_SMALLEST = 1e-12
"""Beyond twelve powers of ten no line can be seen."""


@dataclass(frozen=True, slots=True, eq=False)
class GranLine:
    """A Gran line as drawn: volumes, the function over its greatest value, and the end point."""

    end_point: EndPoint
    V: Floats
    G: Floats
    intercept: float
    gradient: float


@dataclass(frozen=True, slots=True, eq=False)
class _Line:
    crossing: float
    u: float
    intercept: float
    gradient: float
    relative_scatter: float


def gran_line(
    clean: CleanCurve,
    pH: Floats,
    *,
    side: str,
    near_mL: float,
    flask_volume_mL: float | None,
    inner_mL: float | None = None,
) -> GranLine:
    """Return a Gran line on one side of an equivalence point near ``near_mL``.

    ``pH`` are the readings at the points of ``clean`` in pH, ``side`` is ``before`` or ``beyond``,
    ``inner_mL`` an earlier equivalence point from which the last step counts.

    Raises:
        CannotTell: too few points on that side, or the flask's volume is needed and not known.
    """
    rising = pH[-1] >= pH[0]
    power = -pH if rising == (side == "before") else pH
    power = power - power.max()
    method: Method = "gran acid side" if rising == (side == "before") else "gran alkaline side"
    V = clean.V
    if side == "before":
        return _before(clean, power, method, near_mL, flask_volume_mL, inner_mL or 0.0)
    if flask_volume_mL is None:
        raise CannotTell("Beyond the end point Gran's function needs the volume in the flask.")
    picked = np.flatnonzero(near_mL * (1 + _NEAR_BEYOND) <= V)
    G = (flask_volume_mL + V) * np.exp(_LN10 * power)
    form = "(V0 + V)·10^±pH beyond the end point"
    unseen = _UNSEEN_IN_LYE if rising else _UNSEEN
    return _named(clean, picked, G, method, form, unseen=unseen)


def _before(
    clean: CleanCurve,
    power: Floats,
    method: Method,
    near_mL: float,
    flask_volume_mL: float | None,
    inner_mL: float,
) -> GranLine:
    V, reach = clean.V, near_mL - inner_mL
    low, high = near_mL - _FAR * reach, near_mL - _NEAR * reach
    picked = np.flatnonzero((low <= V) & (high >= V) & (inner_mL < V))
    powers = np.exp(_LN10 * power)
    weak = _named(clean, picked, (V - inner_mL) * powers, method, "V·10^±pH, weak in the flask")
    if flask_volume_mL is None or inner_mL:
        return weak
    strong = _named(
        clean,
        picked,
        (flask_volume_mL + V) * powers,
        method,
        "(V0 + V)·10^±pH, strong in the flask",
    )
    return min(weak, strong, key=_bend)


def _bend(line: GranLine) -> float:
    fitted = line.intercept + line.gradient * line.V
    return float(np.mean(((line.G - fitted) / np.maximum(np.abs(fitted), 1e-12)) ** 2))


def _named(
    clean: CleanCurve,
    picked: NDArray[np.intp],
    G: Floats,
    method: Method,
    form: str,
    *,
    unseen: float = _UNSEEN,
) -> GranLine:
    if picked.size < _FEWEST:
        says = f"Only {picked.size} points lie on that side; a line needs at least {_FEWEST}."
        raise CannotTell(says)
    V, G = clean.V[picked], G[picked]
    if not G.max() > 0 or G.min() < _SMALLEST * G.max():
        raise CannotTell("The readings span more than any pH: Gran's function has no line.")
    G = G / G.max()
    whole = _weighted_line(V, G)
    nearest = np.argsort(np.abs(V - whole.crossing))[: max(_FEWEST, picked.size // 2)]
    half = _weighted_line(V[nearest], G[nearest])
    bend = abs(half.crossing - whole.crossing)
    at = np.asarray(clean.at)[picked]
    says = (
        f"Weighted line of {form}, {picked.size} points; its nearer half alone gives "
        f"{half.crossing:.3f} mL. Activity, carbonate and the probe's slope bend and shift it: u "
        f"allows {100 * unseen:g} % for what no bend shows."
    )
    u = float(np.linalg.norm([whole.u, bend, unseen * whole.crossing]))
    end_point = EndPoint(method, whole.crossing, u, tuple(at.tolist()), says)
    return GranLine(end_point, V, G, whole.intercept, whole.gradient)


def _weighted_line(V: Floats, G: Floats) -> _Line:
    """Return the line whose weights are one over the square of its own height, and its zero."""
    weights = 1 / np.square(G)
    middle = float(V.mean())
    x = V - middle
    for _ in range(6):
        total, sx = weights.sum(), weights @ x
        sxx, sy, sxy = weights @ (x * x), weights @ G, weights @ (x * G)
        determinant = total * sxx - sx * sx
        if not determinant > 0:
            raise CannotTell("Gran's function has no line through so few volumes.")
        gradient = (total * sxy - sx * sy) / determinant
        intercept = (sy - gradient * sx) / total
        height = intercept + gradient * x
        weights = 1 / np.square(np.maximum(np.abs(height), 0.003 * np.abs(height).max()))
    if gradient == 0 or not np.isfinite(gradient):
        raise CannotTell("Gran's function does not slope: there is no crossing.")
    chi2 = float(weights @ np.square(G - height)) / (V.size - 2)
    crossing = -intercept / gradient
    variance = chi2 / determinant * (sxx + 2 * crossing * sx + crossing**2 * total) / gradient**2
    return _Line(
        crossing=float(crossing + middle),
        u=float(max(variance, 0.0)) ** 0.5,
        intercept=float(intercept - gradient * middle),
        gradient=float(gradient),
        relative_scatter=chi2**0.5,
    )
