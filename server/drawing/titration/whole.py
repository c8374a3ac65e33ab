"""The whole curve: every point, the fitted line, and every method's volume by shape and name."""

from collections.abc import Sequence
from dataclasses import dataclass

from server.drawing.scale import Scale, scale_around
from server.drawing.svg import element, picture
from server.drawing.titration.frame import (
    LEFT,
    RIGHT,
    WIDTH,
    Frame,
    crosses,
    dots,
    grid,
    halo,
    line,
    taken_line,
)
from server.drawing.titration.told import Drawn, Marked, shape, volume_words

_TOP, _BOTTOM, _HEIGHT = 30.0, 374.0, 412.0
_GAP, _AWAY, _LONGEST = 19.0, 34.0, 190.0


def whole_curve(drawn: Drawn, *, says: str) -> str:
    """Return the picture of a whole curve, read to those who cannot see it as ``says``."""
    frame = Frame(
        along=whole_along(drawn),
        up=scale_around(list(drawn.y), start=_BOTTOM, end=_TOP, room=0.06, least=1e-3),
    )
    places = [frame.at(V, y) for V, y in zip(drawn.V, drawn.y, strict=True)]
    good = [place for at, place in enumerate(places) if at not in drawn.aside]
    parts = [
        *grid(frame, up_name=drawn.kind, along_name="titrant, mL", about=5),
        taken_line(frame, drawn.taken.volume if drawn.taken else None),
        line([frame.at(V, y) for V, y in zip(*drawn.model, strict=True)]) if drawn.model else "",
        dots(good, width=3.6),
        crosses(places[at] for at in sorted(drawn.aside)),
        *_named_marks(frame, drawn, good),
    ]
    return picture(WIDTH, _HEIGHT, says=says, parts=parts, kind="whole-curve")


def whole_along(drawn: Drawn) -> Scale:
    """Return the scale of the volumes that the whole curve and its residuals share."""
    return scale_around(list(drawn.V), start=LEFT, end=RIGHT, room=0.02, least=1e-6)


@dataclass(frozen=True, slots=True)
class _Placed:
    """A mark with its place on the curve."""

    mark: Marked
    x: float
    y: float


def _named_marks(frame: Frame, drawn: Drawn, places: Sequence[tuple[float, float]]) -> list[str]:
    """Return the marks on the curve with their names in a column where the curve leaves room."""
    shown = [
        _Placed(mark, *frame.at(mark.volume, reading_at(drawn, mark.volume)))
        for mark in drawn.marks
        if frame.holds(mark.volume)
    ]
    if not shown or not places:
        return []
    main = next((one for one in shown if one.mark.taken), shown[0])
    left = main.x > (LEFT + RIGHT) / 2
    falls = places[-1][1] > places[0][1]
    at = (min if left else max)(one.x for one in shown) + (-_AWAY if left else _AWAY)
    reach = (at - _LONGEST, at) if left else (at, at + _LONGEST)
    beside = [y for x, y in places if reach[0] <= x <= reach[1]]
    height = _GAP * (len(shown) - 1)
    first = sum(one.y for one in shown) / len(shown) - height / 2
    if left == falls:
        # the curve stands above the names
        first = min(max(first, max(beside, default=frame.top) + 20), frame.bottom - 10 - height)
    else:
        first = max(min(first, min(beside, default=frame.bottom) - 18 - height), frame.top + 8)
    ordered = sorted(shown, key=lambda one: (one.y, one.mark.volume))
    parts: list[str] = []
    for place, one in enumerate(ordered):
        y = first + place * _GAP
        leader = {"d": f"M{at + (4 if left else -4):.1f} {y:.1f}L{one.x:.1f} {one.y:.1f}",
                  "stroke": "currentColor", "stroke-width": 0.7, "fill": "none",
                  "class": "chart-leader"}  # fmt: skip
        text = f"{one.mark.method} {volume_words(one.mark.volume)}"
        kind = "taken-words" if one.mark.taken else "soft"
        anchor = "end" if left else "start"
        parts.append(element("path", leader))
        parts.append(halo(text, at, y + 4, anchor=anchor, kind=kind))
    by_count = sorted(ordered, key=lambda one: one.mark.taken)
    parts += [shape(one.mark.method, one.x, one.y, taken=one.mark.taken) for one in by_count]
    return parts


def reading_at(drawn: Drawn, volume: float) -> float:
    """Return the reading of the curve at a volume: of the fitted line, or between the points."""
    V, y = drawn.model or (drawn.V, drawn.y)
    after = next((at for at, one in enumerate(V) if one >= volume), len(V) - 1)
    before = max(after - 1, 0)
    apart = V[after] - V[before]
    if apart <= 0:
        return float(y[after])
    share = min(max((volume - V[before]) / apart, 0.0), 1.0)
    return float(y[before] + share * (y[after] - y[before]))
