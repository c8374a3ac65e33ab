"""A curve of errors: what is added to each reading, with U, between the limits that are set."""

from collections.abc import Sequence
from dataclasses import dataclass

from server.drawing.scale import Scale, round_values, scale_around
from server.drawing.svg import element, picture, words

_WIDTH, _HEIGHT, _LEFT, _RIGHT, _TOP, _BOTTOM = 560.0, 260.0, 86.0, 540.0, 30.0, 212.0
_RULE = "#ded8ca"
#: A limit that is so many times what the points reach would flatten the curve.
_MOST_ROOM = 3.0


@dataclass(frozen=True, slots=True)
class ErrorPoint:
    """A reading, what is added to it, and the expanded uncertainty of that, in one unit."""

    reading: float
    added: float
    U: float


@dataclass(frozen=True, slots=True)
class CurveWords:
    """What the picture is called: the instrument and the unit."""

    name: str
    unit: str


def error_curve(points: Sequence[ErrorPoint], *, told: CurveWords, limit: float | None) -> str:
    """Return the picture of a curve of errors through its points.

    ``limit`` is drawn as ± where it does not flatten the curve, and told in words where it would.
    """
    ordered = sorted(points, key=lambda one: one.reading)
    if not ordered:
        return picture(_WIDTH, _TOP * 2, says="No point yet.", parts=[], kind="error-curve")
    ends = [end for one in ordered for end in (one.added - one.U, one.added + one.U)]
    far = limit is not None and limit > _MOST_ROOM * max(abs(end) for end in ends)
    ends += [0.0] if limit is None or far else [-limit, 0.0, limit]
    up = scale_around(ends, start=_BOTTOM, end=_TOP, least=1e-9)
    along = scale_around(
        [0.0, *(one.reading for one in ordered)], start=_LEFT, end=_RIGHT, room=0.04, least=1e-6
    )
    parts = [
        words(f"added, {told.unit}", _LEFT - 78, 16),
        *_grid(up, along, told.unit),
        *_limits(up, limit, told.unit, far=far),
        _line(ordered, up, along),
        *(_point(one, up, along) for one in ordered),
    ]
    says = _says(ordered, told, limit)
    return picture(_WIDTH, _HEIGHT, says=says, parts=parts, kind="error-curve")


def decimals_for(step: float) -> int:
    """Return how many decimals tell values that lie ``step`` apart."""
    text = f"{step:.9f}".rstrip("0")
    return len(text.partition(".")[2])


def _grid(up: Scale, along: Scale, unit: str) -> list[str]:
    parts = []
    values = round_values(up.low, up.high)
    decimals = decimals_for(values[1] - values[0]) if len(values) > 1 else 4
    for value in values:
        y = up.at(value)
        zero = abs(value) < 1e-12
        line = {"x1": _LEFT, "x2": _RIGHT, "y1": y, "y2": y, "stroke": _RULE,
                "class": "chart-zero" if zero else "chart-rule"}  # fmt: skip
        parts.append(element("line", line))
        text = "0" if zero else f"{value:+.{decimals}f}"
        parts.append(words(text, _LEFT - 10, y + 4, anchor="end", kind="soft-digits"))
    for value in round_values(along.low, along.high, about=5):
        if value < -1e-12:
            continue
        x = along.at(value)
        tick = {"x1": x, "x2": x, "y1": _BOTTOM + 4, "y2": _BOTTOM + 10,
                "stroke": "currentColor", "class": "chart-tick"}  # fmt: skip
        parts.append(element("line", tick))
        parts.append(words(f"{value:g}", x, _BOTTOM + 26, anchor="middle", kind="soft-digits"))
    parts.append(words(f"reading, {unit}", _RIGHT, _HEIGHT - 4, anchor="end"))
    return parts


def _limits(up: Scale, limit: float | None, unit: str, *, far: bool) -> list[str]:
    if limit is None:
        return []
    if far:
        return [words(f"permitted: ± {limit:g} {unit}, far outside", _RIGHT, 16, anchor="end")]
    parts = []
    for value in (limit, -limit):
        y = up.at(value)
        line = {"x1": _LEFT, "x2": _RIGHT, "y1": y, "y2": y, "stroke": "currentColor",
                "stroke-width": 1.2, "stroke-dasharray": "7 5", "class": "chart-limit"}  # fmt: skip
        parts.append(element("line", line))
    parts.append(words("permitted", _RIGHT, up.at(limit) - 6, anchor="end"))
    return parts


def _line(points: Sequence[ErrorPoint], up: Scale, along: Scale) -> str:
    place = [f"{along.at(one.reading):.2f} {up.at(one.added):.2f}" for one in points]
    look = {"stroke": "currentColor", "stroke-width": 1.6, "fill": "none", "class": "chart-curve"}
    return element("path", {"d": "M" + "L".join(place), **look})


def _point(one: ErrorPoint, up: Scale, along: Scale) -> str:
    x, y = along.at(one.reading), up.at(one.added)
    top, bottom = up.at(one.added + one.U), up.at(one.added - one.U)
    reach = {
        "d": f"M{x:.2f} {top:.2f}V{bottom:.2f}{_end(x, top)}{_end(x, bottom)}",
        "stroke": "currentColor",
        "stroke-width": 1.8,
        "fill": "none",
        "class": "chart-reach",
    }
    dot = {"cx": x, "cy": y, "r": 4.5, "fill": "#fffdf8", "stroke": "currentColor",
           "stroke-width": 1.6, "class": "chart-hollow"}  # fmt: skip
    parts = [element("path", reach)] if one.U > 0 else []
    return element("g", {}, *parts, element("circle", dot))


def _end(x: float, y: float) -> str:
    return f"M{x - 5:.2f} {y:.2f}h10"


def _plain(value: float) -> str:
    """Return what is added, with its sign, never in exponent form."""
    text = f"{value:+.9f}".rstrip("0").rstrip(".")
    return "0" if text in {"+0", "-0"} else text


def _says(points: Sequence[ErrorPoint], told: CurveWords, limit: float | None) -> str:
    each = "; ".join(f"{one.reading:.9g}: {_plain(one.added)} ± {one.U:.2g}" for one in points)
    bound = "" if limit is None else f" Permitted are ± {limit:g} {told.unit}."
    return f"Added to the readings of {told.name}, in {told.unit}: {each}.{bound}"
