"""Replicate dots: each replicate's value against their mean and its interval."""

from collections.abc import Sequence
from dataclasses import dataclass

from server.drawing.scale import Scale, scale_around
from server.drawing.svg import element, picture, words

_WIDTH, _HEIGHT, _LEFT, _RIGHT, _TOP, _BOTTOM = 420.0, 210.0, 92.0, 404.0, 26.0, 172.0
_LABEL_GAP = 14.0


@dataclass(frozen=True, slots=True)
class Dot:
    """One replicate: its label, its value, and whether it was left out of the mean."""

    label: str
    value: float
    excluded: bool


def replicate_dots(
    dots: Sequence[Dot],
    *,
    mean: float,
    low: float | None,
    high: float | None,
    decimals: int,
    unit: str,
) -> str:
    """Return the picture of the replicates around their mean and its 95 % interval.

    ``low`` and ``high`` bound the interval and are None where there is none (one replicate).
    A replicate left out stays in the picture, hollow and crossed.
    """
    bounds = [value for value in (low, high) if value is not None]
    values = [dot.value for dot in dots]
    scale = scale_around(
        [*values, mean, *bounds], start=_BOTTOM, end=_TOP, least=10.0 ** (1 - decimals)
    )
    parts = [
        *_interval(scale, low, high),
        *_lines(scale, mean=mean, bounds=bounds, decimals=decimals),
        words(unit, _LEFT - 10, 14, anchor="end"),
    ]
    step = (_RIGHT - _LEFT) / max(len(dots), 1)
    for place, dot in enumerate(dots):
        x = _LEFT + step * (place + 0.5)
        parts += [_dot(dot, x, scale.at(dot.value)), words(dot.label, x, 194, anchor="middle")]
    says = _says(dots, mean=mean, bounds=bounds, decimals=decimals, unit=unit)
    return picture(_WIDTH, _HEIGHT, says=says, parts=parts, kind="dots")


def _interval(scale: Scale, low: float | None, high: float | None) -> list[str]:
    if low is None or high is None:
        return []
    top, bottom = scale.at(high), scale.at(low)
    band = {
        "x": _LEFT,
        "y": top,
        "width": _RIGHT - _LEFT,
        "height": max(bottom - top, 1.0),
        "fill": "#fbe3ee",
        "class": "chart-band",
    }
    return [
        element("rect", band),
        words("95 % interval of the mean", _RIGHT, 14, anchor="end"),
    ]


def _lines(scale: Scale, *, mean: float, bounds: list[float], decimals: int) -> list[str]:
    """The mean is always named; a bound only where its words would not run into others."""
    y = scale.at(mean)
    line = {
        "x1": _LEFT,
        "x2": _RIGHT,
        "y1": y,
        "y2": y,
        "stroke": "#b0125f",
        "stroke-width": 2,
        "class": "chart-point-line",
    }
    named = [y]
    parts = [
        element("line", line),
        words(f"{mean:.{decimals}f}", _LEFT - 10, y + 4, anchor="end", size=13, kind="digits"),
    ]
    for bound in bounds:
        y = scale.at(bound)
        if all(abs(y - other) >= _LABEL_GAP for other in named):
            named.append(y)
            text = f"{bound:.{decimals}f}"
            parts.append(words(text, _LEFT - 10, y + 4, anchor="end", size=12, kind="soft-digits"))
    return parts


def _dot(dot: Dot, x: float, y: float) -> str:
    if not dot.excluded:
        return element(
            "circle", {"cx": x, "cy": y, "r": 6, "fill": "currentColor", "class": "chart-ink"}
        )
    ring = {
        "cx": x,
        "cy": y,
        "r": 6.5,
        "fill": "none",
        "stroke": "currentColor",
        "stroke-width": 1.6,
        "class": "chart-out",
    }
    cross = {
        "d": f"M{x - 4:.2f} {y - 4:.2f}l8 8m0-8l-8 8",
        "stroke": "currentColor",
        "stroke-width": 1.6,
        "class": "chart-out",
    }
    return element("g", {}, element("circle", ring), element("path", cross))


def _says(
    dots: Sequence[Dot], *, mean: float, bounds: list[float], decimals: int, unit: str
) -> str:
    if not dots:
        return "No replicate yet."
    each = ", ".join(
        f"{dot.label}: {dot.value:.{decimals}f}{' (left out)' if dot.excluded else ''}"
        for dot in dots
    )
    says = f"Replicates in {unit}: {each}. Mean {mean:.{decimals}f}"
    if len(bounds) == 2:
        says += f", 95 % interval {bounds[0]:.{decimals}f} to {bounds[1]:.{decimals}f}"
    return says + "."
