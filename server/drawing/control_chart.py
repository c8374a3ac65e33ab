"""Checks over time between warning and action limits."""

from collections.abc import Sequence
from dataclasses import dataclass

from server.drawing.error_curve import decimals_for
from server.drawing.scale import Scale, round_values, scale_around
from server.drawing.svg import element, picture, words

_WIDTH, _HEIGHT, _LEFT, _RIGHT, _TOP, _BOTTOM = 560.0, 230.0, 86.0, 540.0, 30.0, 192.0
_RULE = "#ded8ca"


@dataclass(frozen=True, slots=True)
class CheckPoint:
    """One check: its day in words, how far it lies off the centre, its verdict."""

    label: str
    off: float
    verdict: str


@dataclass(frozen=True, slots=True)
class Limits:
    """Where a chart warns and stops, around zero, in ``unit``; ``name`` is what is checked."""

    name: str
    unit: str
    warning: float
    action: float


def control_chart(points: Sequence[CheckPoint], limits: Limits) -> str:
    """Return the chart of checks in the order in which they were made, evenly spaced."""
    if not points:
        return picture(_WIDTH, _TOP * 2, says="No check yet.", parts=[], kind="control-chart")
    reach = max(limits.action * 1.35, *(abs(one.off) * 1.1 for one in points))
    up = scale_around([-reach, reach], start=_BOTTOM, end=_TOP, room=0.0, least=1e-9)
    along = Scale(low=-0.5, high=len(points) - 0.5, start=_LEFT, end=_RIGHT)
    parts = [
        words(f"off, {limits.unit}", _LEFT - 78, 16),
        *_scale(up),
        *_limit(up, limits.action, "action", dashes="", below=-5.0),
        *_limit(up, limits.warning, "warning", dashes="7 5", below=13.0),
        _zero(up),
        _line(points, up, along),
        *(_point(one, along.at(i), up.at(one.off)) for i, one in enumerate(points)),
        *_days(points, along),
    ]
    return picture(_WIDTH, _HEIGHT, says=_says(points, limits), parts=parts, kind="control-chart")


def _scale(up: Scale) -> list[str]:
    values = round_values(up.low, up.high)
    decimals = decimals_for(values[1] - values[0]) if len(values) > 1 else 4
    return [
        words(
            "0" if abs(value) < 1e-12 else f"{value:+.{decimals}f}",
            _LEFT - 10, up.at(value) + 4, anchor="end", kind="soft-digits",
        )
        for value in values
    ]  # fmt: skip


def _limit(up: Scale, value: float, word: str, *, dashes: str, below: float) -> list[str]:
    """Return the two lines of a limit; its word stands away from the other limit's."""
    parts = []
    for one in (value, -value):
        y = up.at(one)
        line = {"x1": _LEFT, "x2": _RIGHT, "y1": y, "y2": y, "stroke": "currentColor",
                "stroke-width": 1.2, "class": f"chart-{word}"}  # fmt: skip
        parts.append(element("line", {**line, "stroke-dasharray": dashes} if dashes else line))
    parts.append(words(word, _LEFT + 4, up.at(value) + below))
    return parts


def _zero(up: Scale) -> str:
    y = up.at(0.0)
    line = {"x1": _LEFT, "x2": _RIGHT, "y1": y, "y2": y, "stroke": _RULE, "class": "chart-zero"}
    return element("line", line)


def _line(points: Sequence[CheckPoint], up: Scale, along: Scale) -> str:
    place = [f"{along.at(i):.2f} {up.at(one.off):.2f}" for i, one in enumerate(points)]
    look = {"stroke": "currentColor", "stroke-width": 1.2, "fill": "none", "class": "chart-curve"}
    return element("path", {"d": "M" + "L".join(place), **look})


def _point(one: CheckPoint, x: float, y: float) -> str:
    """A ring for what holds, a triangle for what is looked at, a cross for what fails."""
    line = {"stroke": "currentColor", "stroke-width": 1.8, "fill": "#fffdf8"}
    if one.verdict == "fails":
        d = f"M{x - 5:.2f} {y - 5:.2f}l10 10m0 -10l-10 10"
        return element("path", {"d": d, **line, "stroke-width": 2.6, "class": "chart-fails"})
    if one.verdict == "look":
        d = f"M{x:.2f} {y - 6:.2f}l6 10.5h-12z"
        return element("path", {"d": d, **line, "class": "chart-look"})
    return element("circle", {"cx": x, "cy": y, "r": 3.6, **line, "class": "chart-hollow"})


def _days(points: Sequence[CheckPoint], along: Scale) -> list[str]:
    if len(points) == 1:
        return [words(points[0].label, along.at(0), _HEIGHT - 8, anchor="middle")]
    return [
        words(points[0].label, _LEFT, _HEIGHT - 8),
        words(points[-1].label, _RIGHT, _HEIGHT - 8, anchor="end"),
    ]


def _says(points: Sequence[CheckPoint], limits: Limits) -> str:
    failed = [one.label for one in points if one.verdict == "fails"]
    looked = [one.label for one in points if one.verdict == "look"]
    last = points[-1]
    says = (
        f"{limits.name}: {_counted(points)}; warning ± "
        f"{limits.warning:g} {limits.unit}, action ± {limits.action:g} {limits.unit}. "
        f"The last is {last.off:+.6g} {limits.unit} off."
    )
    if looked:
        says += f" Beyond the warning limit: {', '.join(looked)}."
    if failed:
        says += f" Failed: {', '.join(failed)}."
    return says


def _counted(points: Sequence[CheckPoint]) -> str:
    if len(points) == 1:
        return f"one check, {points[0].label}"
    return f"{len(points)} checks from {points[0].label} to {points[-1].label}"
