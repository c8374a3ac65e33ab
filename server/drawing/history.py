"""A lot's certificates over time: each concentration with its expanded uncertainty."""

from collections.abc import Sequence
from dataclasses import dataclass

from server.drawing.scale import Scale, round_values, scale_around
from server.drawing.svg import element, picture, words

_WIDTH, _HEIGHT, _LEFT, _RIGHT, _TOP, _BOTTOM = 560.0, 220.0, 84.0, 536.0, 26.0, 178.0
_LABEL_ROOM = 92.0


@dataclass(frozen=True, slots=True)
class HistoryPoint:
    """One certificate: label, day (any running number of days), value, U, whether it stands."""

    label: str
    day: float
    value: float
    U: float
    standing: bool


def certificate_history(points: Sequence[HistoryPoint], *, unit: str, decimals: int) -> str:
    """Return the picture of the certificates by day, the standing one filled."""
    ordered = sorted(points, key=lambda point: point.day)
    if not ordered:
        return picture(_WIDTH, _TOP * 2, says="No certificate yet.", parts=[], kind="history")
    ends = [end for point in ordered for end in (point.value - point.U, point.value + point.U)]
    up = scale_around(ends, start=_BOTTOM, end=_TOP, least=10.0 ** (1 - decimals))
    along = scale_around(
        [point.day for point in ordered], start=_LEFT, end=_RIGHT, room=0.1, least=1.0
    )
    parts = [words(unit, _LEFT - 10, 14, anchor="end"), *_grid(up, decimals)]
    labelled = _labelled(ordered, along)
    for place, point in enumerate(ordered):
        x = along.at(point.day)
        parts.append(_point(point, x, up))
        if place in labelled:
            parts.append(words(point.label, x, 202, anchor="middle"))
    says = _says(ordered, unit=unit, decimals=decimals)
    return picture(_WIDTH, _HEIGHT, says=says, parts=parts, kind="history")


def _grid(up: Scale, decimals: int) -> list[str]:
    parts = []
    for value in round_values(up.low, up.high):
        y = up.at(value)
        line = {
            "x1": _LEFT,
            "x2": _RIGHT,
            "y1": y,
            "y2": y,
            "stroke": "#ded8ca",
            "class": "chart-rule",
        }
        text = f"{value:.{decimals}f}"
        parts.append(element("line", line))
        parts.append(words(text, _LEFT - 10, y + 4, anchor="end", kind="soft-digits"))
    return parts


def _labelled(points: Sequence[HistoryPoint], along: Scale) -> set[int]:
    """The newest is always named, then older ones as far as their words have room."""
    named: list[int] = []
    for place in reversed(range(len(points))):
        x = along.at(points[place].day)
        if all(abs(x - along.at(points[other].day)) >= _LABEL_ROOM for other in named):
            named.append(place)
    return set(named)


def _point(point: HistoryPoint, x: float, up: Scale) -> str:
    top, bottom = up.at(point.value + point.U), up.at(point.value - point.U)
    reach = {
        "d": f"M{x:.2f} {top:.2f}V{bottom:.2f}{_end(x, top)}{_end(x, bottom)}",
        "stroke": "currentColor",
        "stroke-width": 1.8,
        "fill": "none",
        "class": "chart-reach",
    }
    dot = {"cx": x, "cy": up.at(point.value), "r": 6.5 if point.standing else 5}
    if point.standing:
        look = {"fill": "#b0125f", "class": "chart-point"}
    else:
        look = {"fill": "#fffdf8", "stroke": "currentColor", "class": "chart-hollow"}
    return element("g", {}, element("path", reach), element("circle", {**dot, **look}))


def _end(x: float, y: float) -> str:
    return f"M{x - 5:.2f} {y:.2f}h10"


def _says(points: Sequence[HistoryPoint], *, unit: str, decimals: int) -> str:
    each = "; ".join(
        f"{point.label}: {point.value:.{decimals}f} ± {point.U:.{decimals}f}"
        f"{' (standing)' if point.standing else ''}"
        for point in points
    )
    return f"Certificates of this lot in {unit}: {each}."
