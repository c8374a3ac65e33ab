"""What more replicates would bring: the expanded uncertainty to expect by their number."""

from collections.abc import Sequence
from dataclasses import dataclass

from server.drawing.scale import Scale, round_values
from server.drawing.svg import element, picture, words

_WIDTH, _HEIGHT, _LEFT, _RIGHT, _TOP, _BOTTOM = 420.0, 216.0, 58.0, 404.0, 30.0, 168.0
_ROOM = 1.18


@dataclass(frozen=True, slots=True)
class Expected:
    """The U in percent to expect of the mean of n replicates; ``chosen`` is what is planned."""

    n: int
    U_percent: float
    chosen: bool


def expected_uncertainty(points: Sequence[Expected], *, wanted_percent: float | None = None) -> str:
    """Return the picture of U by the number of replicates, from zero up, with the wanted U.

    Zero is on the picture, so that heights compare: what replicates cannot shrink is seen.
    """
    if not points:
        return picture(_WIDTH, _TOP * 2, says="Nothing is planned yet.", parts=[], kind="planned")
    tops = [one.U_percent for one in points] + ([wanted_percent] if wanted_percent else [])
    up = Scale(low=0.0, high=max(tops) * _ROOM, start=_BOTTOM, end=_TOP)
    parts = [words("U, %", _LEFT - 10, 16, anchor="end"), *_grid(up)]
    step = (_RIGHT - _LEFT) / len(points)
    for place, one in enumerate(points):
        parts += _column(one, _LEFT + step * (place + 0.5), up)
    parts.append(words("replicates", (_LEFT + _RIGHT) / 2, 209, anchor="middle"))
    if wanted_percent:
        parts += _wanted(wanted_percent, up)
    return picture(_WIDTH, _HEIGHT, says=_says(points, wanted_percent), parts=parts, kind="planned")


def _grid(up: Scale) -> list[str]:
    parts = []
    for value in round_values(up.low, up.high, about=4):
        y = up.at(value)
        rule = {"x1": _LEFT, "x2": _RIGHT, "y1": y, "y2": y, "stroke": "#ded8ca"}
        parts.append(element("line", {**rule, "class": "chart-rule"}))
        parts.append(words(f"{value:.3g}", _LEFT - 10, y + 4, anchor="end", kind="soft-digits"))
    return parts


def _column(one: Expected, x: float, up: Scale) -> list[str]:
    y = up.at(one.U_percent)
    stem = {"x1": x, "x2": x, "y1": up.at(0.0), "y2": y, "stroke": "currentColor"}
    dot = {"cx": x, "cy": y, "r": 7 if one.chosen else 5}
    look = (
        {"fill": "#b0125f", "class": "chart-point"}
        if one.chosen
        else {"fill": "currentColor", "class": "chart-ink"}
    )
    return [
        element("line", {**stem, "stroke-width": 1.6, "class": "chart-reach"}),
        element("circle", {**dot, **look}),
        words(f"{one.U_percent:.3f}", x, y - 11, anchor="middle", size=12.5, kind="digits"),
        words(str(one.n), x, 188, anchor="middle", size=13, kind="digits"),
    ]


def _wanted(wanted: float, up: Scale) -> list[str]:
    y = up.at(wanted)
    line = {
        "x1": _LEFT,
        "x2": _RIGHT,
        "y1": y,
        "y2": y,
        "stroke": "#b0125f",
        "stroke-width": 1.6,
        "stroke-dasharray": "5 4",
        "class": "chart-point-line",
    }
    return [element("line", line), words(f"wanted {wanted:g} %", _RIGHT, 16, anchor="end")]


def _says(points: Sequence[Expected], wanted: float | None) -> str:
    each = ", ".join(f"{one.n}: {one.U_percent:.3f} %" for one in points)
    says = f"Expanded uncertainty to expect by the number of replicates: {each}."
    return f"{says} Wanted: {wanted:g} %." if wanted else says
