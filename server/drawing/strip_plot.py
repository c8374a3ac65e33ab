"""Strips: the values of several methods over one scale, each with its mean and its interval."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass

from server.drawing.scale import Scale, round_values
from server.drawing.svg import element, picture, words

_WIDTH, _LEFT, _RIGHT = 420.0, 14.0, 406.0
_TOP, _ROW, _POINTS, _BAR, _FOOT = 46.0, 74.0, 30.0, 54.0, 50.0
_LANES, _APART = (0.0, -9.0, 9.0), 11.0
_REACH = 4.5
#: A method farther away than so many margins is told by an arrow at the edge: the others would
#: shrink to a dot.
_FAR_MARGINS = 10.0


@dataclass(frozen=True, slots=True)
class Strip:
    """One method: its values, the 95 % interval of their mean (None: one value), what it is.

    ``chosen`` is the one that the number rests on; ``says`` stands at the right of its name.
    """

    name: str
    values: tuple[float, ...]
    mean: float
    interval: tuple[float, float] | None
    says: str = ""
    chosen: bool = False


@dataclass(frozen=True, slots=True)
class Middle:
    """What the strips are seen against: a value, what it is, and the margin around it."""

    value: float
    name: str
    margin_percent: float

    @property
    def margin(self) -> float:
        """The margin in the unit of the value."""
        return abs(self.value) * self.margin_percent / 100


def shape_name(place: int) -> str:
    """Return the word for the shape of the strip at a place, counted from 0."""
    return _SHAPES[place % len(_SHAPES)][0]


def shape(place: int, *, size: int = 14) -> str:
    """Return the shape of a strip alone, for the table beside the picture."""
    attributes = {
        "xmlns": "http://www.w3.org/2000/svg",
        "viewBox": "0 0 14 14",
        "width": size,
        "height": size,
        "role": "img",
        "aria-label": shape_name(place),
        "class": "mark",
    }
    return element("svg", attributes, _SHAPES[place % len(_SHAPES)][1](7.0, 7.0, _INK))


def strip_plot(strips: Sequence[Strip], middle: Middle, *, decimals: int, unit: str) -> str:
    """Return the picture of at least one strip around the middle."""
    scale = _scale(strips, middle)
    bottom = _TOP + _ROW * len(strips)
    parts = [*_margin(scale, middle, bottom), *_axis(scale, bottom, unit)]
    for place, strip in enumerate(strips):
        parts += _rules(scale, middle, _TOP + _ROW * place)
        parts += _strip(strip, place, scale, _TOP + _ROW * place)
    says = _says(strips, middle, decimals=decimals, unit=unit)
    return picture(_WIDTH, bottom + _FOOT, says=says, parts=parts, kind="strips")


def _far(strip: Strip, middle: Middle) -> bool:
    return abs(strip.mean - middle.value) > _FAR_MARGINS * middle.margin


def _scale(strips: Sequence[Strip], middle: Middle) -> Scale:
    near = [one for one in strips if not _far(one, middle)]
    reach = max(
        (abs(value - middle.value) for one in near for value in (*one.values, one.mean)),
        default=0.0,
    )
    half = 1.06 * max(reach, 1.6 * middle.margin)
    return Scale(middle.value - half, middle.value + half, _LEFT + _REACH, _RIGHT - _REACH)


def _margin(scale: Scale, middle: Middle, bottom: float) -> list[str]:
    low, high = (scale.at(middle.value + way * middle.margin) for way in (-1, 1))
    band = {"x": low, "y": _TOP - 8, "width": high - low, "height": bottom - _TOP + 8}
    x = scale.at(middle.value)
    return [
        element("rect", {**band, "fill": "#fbe3ee", "class": "chart-band"}),
        words(middle.name, x, 14, anchor="middle", size=12.5),
        words(f"± {middle.margin_percent:g} %", x, 31, anchor="middle", size=12.5),
    ]


def _rules(scale: Scale, middle: Middle, top: float) -> list[str]:
    """The middle and the ends of the margin beside one strip's points, not across its words."""
    found = []
    for way, dashes in ((-1, "2 4"), (0, ""), (1, "2 4")):
        x = scale.at(middle.value + way * middle.margin)
        line = {"x1": x, "x2": x, "y1": top + 15, "y2": top + _ROW - 8, "stroke": "#b0125f"}
        line |= {"stroke-dasharray": dashes} if dashes else {"stroke-width": 1.4}
        found.append(element("line", {**line, "class": "chart-point-line"}))
    return found


def _axis(scale: Scale, bottom: float, unit: str) -> list[str]:
    line = {"x1": _LEFT, "x2": _RIGHT, "y1": bottom, "y2": bottom, "stroke": "currentColor"}
    parts = [element("line", {**line, "class": "chart-tick"})]
    values = round_values(scale.low, scale.high, about=5)
    step = values[1] - values[0] if len(values) > 1 else scale.high - scale.low
    decimals = next((n for n in range(9) if round(step, n) >= step * (1 - 1e-6)), 9)
    # neighbouring words must not touch: with many digits every second tick goes without them
    every = 1 if len(values) * (decimals + 2) * 8 < _RIGHT - _LEFT else 2
    for place, value in enumerate(values):
        x = scale.at(value)
        tick = {"x1": x, "x2": x, "y1": bottom, "y2": bottom + 5, "stroke": "currentColor"}
        parts.append(element("line", {**tick, "class": "chart-tick"}))
        if place % every == 0:
            anchor = "start" if x < _LEFT + 24 else "end" if x > _RIGHT - 24 else "middle"
            text = f"{value:.{decimals}f}"
            parts.append(words(text, x, bottom + 21, anchor=anchor, kind="soft-digits"))
    middle = (_LEFT + _RIGHT) / 2
    parts.append(words(unit, middle, bottom + 42, anchor="middle", size=12.5))
    return parts


def _strip(strip: Strip, place: int, scale: Scale, top: float) -> list[str]:
    look = _CHOSEN if strip.chosen else _INK
    draw = _SHAPES[place % len(_SHAPES)][1]
    parts = [
        element(
            "line",
            {
                "x1": _LEFT,
                "x2": _RIGHT,
                "y1": top - 8,
                "y2": top - 8,
                "stroke": "#ded8ca",
                "class": "chart-rule",
            },
        ),
        draw(_LEFT + 6, top + 3, look),
        words(strip.name, _LEFT + 18, top + 8, size=13.5, kind="name"),
        words(strip.says, _RIGHT, top + 8, anchor="end", kind="soft-digits"),
    ]
    if not scale.low <= strip.mean <= scale.high:
        return [*parts, *_beyond(strip, scale, top)]
    parts += [
        draw(x, top + _POINTS + lane, look)
        for x, lane in _lanes([scale.at(value) for value in strip.values])
    ]
    return [*parts, *_interval(strip, scale, top + _BAR, look)]


def _lanes(places: list[float]) -> list[tuple[float, float]]:
    """Return each place with a lane, so that neighbours do not hide each other."""
    last = dict.fromkeys(_LANES, float("-inf"))
    found = []
    for x in sorted(places):
        free = (lane for lane in _LANES if x - last[lane] >= _APART)
        lane = next(free, min(last, key=lambda one: last[one]))
        last[lane] = x
        found.append((x, lane))
    return found


def _interval(strip: Strip, scale: Scale, y: float, look: "_Look") -> list[str]:
    """The mean as an upright stroke on its interval; an end beyond the picture is an arrow."""
    stroke = {"stroke": look.stroke, "stroke-width": 2, "class": look.line, "fill": "none"}
    x = scale.at(strip.mean)
    parts = [element("path", {"d": f"M{x:.2f} {y - 7:.2f}v14", **stroke, "stroke-width": 3})]
    if strip.interval is None:
        return parts
    ends = []
    for bound, edge, way in zip(strip.interval, (_LEFT, _RIGHT), (-1, 1), strict=True):
        inside = scale.low <= bound <= scale.high
        end = scale.at(bound) if inside else edge
        ends.append(end)
        cap = f"M{end:.2f} {y - 4:.2f}v8" if inside else _head(end, y, way)
        parts.append(element("path", {"d": cap, **stroke}))
    parts.append(element("path", {"d": f"M{ends[0]:.2f} {y:.2f}H{ends[1]:.2f}", **stroke}))
    return parts


def _beyond(strip: Strip, scale: Scale, top: float) -> list[str]:
    """A method that lies far beyond the others: an arrow at the edge, and how far."""
    way = 1 if strip.mean > scale.high else -1
    edge, y = (_RIGHT if way > 0 else _LEFT), top + _POINTS + 8
    stroke = {"stroke": "currentColor", "stroke-width": 2, "class": "chart-out", "fill": "none"}
    middle = (scale.low + scale.high) / 2
    off = 100 * (strip.mean / middle - 1)
    return [
        element("path", {"d": f"M{edge - way * 34:.2f} {y:.2f}H{edge:.2f}", **stroke}),
        element("path", {"d": _head(edge, y, way), **stroke}),
        words(
            f"{off:+.2f} %",
            edge - way * 42,
            y + 4,
            anchor="end" if way > 0 else "start",
            kind="digits",
        ),
    ]


def _head(x: float, y: float, way: int) -> str:
    return f"M{x - way * 7:.2f} {y - 5:.2f}L{x:.2f} {y:.2f}L{x - way * 7:.2f} {y + 5:.2f}"


@dataclass(frozen=True, slots=True)
class _Look:
    stroke: str
    line: str
    face: str


_INK = _Look("currentColor", "chart-out", "chart-ink")
_CHOSEN = _Look("#b0125f", "chart-point-line", "chart-point")
_Draw = Callable[[float, float, _Look], str]


def _filled(path: str) -> _Draw:
    def draw(x: float, y: float, look: _Look) -> str:
        d = f"M{x:.2f} {y:.2f}{path}"
        return element("path", {"d": d, "fill": look.stroke, "class": look.face})

    return draw


def _lined(path: str) -> _Draw:
    def draw(x: float, y: float, look: _Look) -> str:
        d = f"M{x:.2f} {y:.2f}{path}"
        line = {"fill": "none", "stroke": look.stroke, "stroke-width": 1.8, "class": look.line}
        return element("path", {"d": d, **line})

    return draw


_SHAPES: tuple[tuple[str, _Draw], ...] = (
    ("filled circle", _filled("m-4.5 0a4.5 4.5 0 1 0 9 0a4.5 4.5 0 1 0 -9 0z")),
    ("hollow square", _lined("m-3.8 -3.8h7.6v7.6h-7.6z")),
    ("filled triangle", _filled("m0 -5.2l5 9h-10z")),
    ("upright cross", _lined("m-4.8 0h9.6m-4.8 -4.8v9.6")),
    ("hollow diamond", _lined("m0 -5l4.6 5l-4.6 5l-4.6 -5z")),
    ("slanting cross", _lined("m-3.8 -3.8l7.6 7.6m0 -7.6l-7.6 7.6")),
    ("filled square", _filled("m-4 -4h8v8h-8z")),
    ("hollow circle", _lined("m-4.2 0a4.2 4.2 0 1 0 8.4 0a4.2 4.2 0 1 0 -8.4 0z")),
    ("hollow triangle", _lined("m0 4.8l4.8 -8.4h-9.6z")),
)


def _says(strips: Sequence[Strip], middle: Middle, *, decimals: int, unit: str) -> str:
    each = []
    for place, one in enumerate(strips):
        text = f"{one.name} ({shape_name(place)}): {len(one.values)} values"
        text = text if len(one.values) != 1 else text[:-1]
        text += f", mean {one.mean:.{decimals}f}"
        if one.interval is not None:
            low, high = (f"{bound:.{decimals}f}" for bound in one.interval)
            text += f", 95 % interval {low} to {high}"
        each.append(text)
    margin = f"{middle.name} {middle.value:.{decimals}f}, margin ± {middle.margin_percent:g} %"
    return f"End-point methods in {unit}. {'; '.join(each)}. Seen against {margin}."
