"""The frame of a picture: scales, rules, names of the axes, points as dots."""

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

from server.drawing.error_curve import decimals_for
from server.drawing.scale import Scale, round_values
from server.drawing.svg import element, words

WIDTH, LEFT, RIGHT = 480.0, 46.0, 470.0
_RULE = "#ded8ca"
#: Dots nearer than this to the one before, in pixels, would only make the page longer.
_SAME_DOT, _SAME_PLACE = 1.1, 1.2


@dataclass(frozen=True, slots=True)
class Frame:
    """Where a picture's values stand: along (mL) and up."""

    along: Scale
    up: Scale

    @property
    def top(self) -> float:
        """The upper edge in pixels."""
        return self.up.end

    @property
    def bottom(self) -> float:
        """The lower edge in pixels."""
        return self.up.start

    def holds(self, volume: float) -> bool:
        """Tell whether a volume lies between the edges."""
        return self.along.low <= volume <= self.along.high

    def at(self, volume: float, value: float) -> tuple[float, float]:
        """Return the pixel of a volume and a value, the value held between the edges."""
        y = self.up.at(value)
        return self.along.at(volume), min(max(y, self.top), self.bottom)


def grid(frame: Frame, *, up_name: str, along_name: str | None, about: int = 4) -> list[str]:
    """Return rules with their values; the volumes are written where ``along_name`` is given."""
    parts = [words(up_name, 4, frame.top - 10, size=11)]
    values = round_values(frame.up.low, frame.up.high, about=about)
    decimals = _decimals(values)
    for value in values:
        y = frame.up.at(value)
        if not frame.top - 0.5 <= y <= frame.bottom + 0.5:
            continue
        line = {"x1": LEFT, "x2": RIGHT, "y1": y, "y2": y, "stroke": _RULE, "class": "chart-rule"}
        parts.append(element("line", line))
        text = f"{value + 0.0:.{decimals}f}"
        parts.append(words(text, LEFT - 7, y + 4, anchor="end", size=11, kind="soft-digits"))
    base = {"x1": LEFT, "x2": RIGHT, "y1": frame.bottom, "y2": frame.bottom,
            "stroke": "currentColor", "class": "chart-edge"}  # fmt: skip
    parts.append(element("line", base))
    if along_name is None:
        return parts
    return [*parts, *volumes_along(frame, along_name)]


def volumes_along(frame: Frame, name: str) -> list[str]:
    """Return ticks and values of the volumes under a frame, with the axis's name."""
    parts = []
    values = round_values(frame.along.low, frame.along.high, about=5)
    decimals = _decimals(values)
    for value in values:
        if not frame.holds(value):
            continue
        x = frame.along.at(value)
        tick = {"x1": x, "x2": x, "y1": frame.bottom, "y2": frame.bottom + 5,
                "stroke": "currentColor", "class": "chart-edge"}  # fmt: skip
        parts.append(element("line", tick))
        text = f"{value + 0.0:.{decimals}f}"
        parts.append(
            words(text, x, frame.bottom + 18, anchor="middle", size=11, kind="soft-digits")
        )
    return [*parts, words(name, RIGHT, frame.bottom + 34, anchor="end", size=11)]


def dots(places: Iterable[tuple[float, float]], *, kind: str = "dots", width: float = 4) -> str:
    """Return points as one path of round dots; those that would cover each other are drawn once."""
    kept = _apart(places, _SAME_DOT)
    look = {"stroke": "currentColor", "stroke-width": width, "stroke-linecap": "round",
            "fill": "none", "class": f"chart-{kind}"}  # fmt: skip
    return element("path", {"d": _moves(kept, "m", after="h0"), **look}) if kept else ""


def _apart(places: Iterable[tuple[float, float]], least: float) -> list[tuple[float, float]]:
    """Return the places, without those that lie on the pixels of the one kept before."""
    kept: list[tuple[float, float]] = []
    for x, y in places:
        if not kept or abs(x - kept[-1][0]) + abs(y - kept[-1][1]) >= least:
            kept.append((x, y))
    return kept


def _moves(places: Sequence[tuple[float, float]], step: str, *, after: str = "") -> str:
    """Return a path from place to place in steps of a tenth of a pixel, which are short to write.

    The steps are those between rounded places, so that no rounding adds up.
    """
    x, y = round(10 * places[0][0]), round(10 * places[0][1])
    d = [f"M{x / 10:g} {y / 10:g}{after}"]
    for place in places[1:]:
        to_x, to_y = round(10 * place[0]), round(10 * place[1])
        d.append(f"{step}{(to_x - x) / 10:g} {(to_y - y) / 10:g}{after}".replace(" -", "-"))
        x, y = to_x, to_y
    return "".join(d)


def crosses(places: Iterable[tuple[float, float]]) -> str:
    """Return points that count little or nothing as crosses."""
    d = "".join(f"M{x - 3.5:.1f} {y - 3.5:.1f}l7 7m0-7l-7 7" for x, y in places)
    look = {"stroke": "currentColor", "stroke-width": 1.4, "fill": "none", "class": "chart-aside"}
    return element("path", {"d": d, **look}) if d else ""


def line(places: Sequence[tuple[float, float]], *, kind: str = "model") -> str:
    """Return a line through points; ones that lie on their neighbours' pixel are left out."""
    if len(places) < 2:
        return ""
    kept = [*_apart(places[:-1], _SAME_PLACE), places[-1]]
    look = {"stroke": "currentColor", "stroke-width": 1.3, "fill": "none",
            "class": f"chart-{kind}"}  # fmt: skip
    return element("path", {"d": _moves(kept, "l"), **look})


def taken_line(frame: Frame, volume: float | None) -> str:
    """Return the upright line at the volume that counts, through the whole height."""
    if volume is None or not frame.holds(volume):
        return ""
    x = frame.along.at(volume)
    look = {"x1": x, "x2": x, "y1": frame.top - 4, "y2": frame.bottom, "stroke": "#b0125f",
            "stroke-width": 1.5, "class": "chart-point-line"}  # fmt: skip
    return element("line", look)


def halo(text: str, x: float, y: float, *, anchor: str = "start", kind: str = "soft") -> str:
    """Return words that stay readable over lines."""
    return words(text, x, y, anchor=anchor, size=11, kind=f"{kind} chart-halo")


def _decimals(values: Sequence[float]) -> int:
    return decimals_for(abs(values[1] - values[0])) if len(values) > 1 else 2
