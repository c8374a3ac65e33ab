"""Gran's lines: the function on each side with the straight line that leads to its zero."""

from collections.abc import Sequence
from dataclasses import dataclass

from server.drawing.scale import Scale, scale_around
from server.drawing.svg import element, picture
from server.drawing.titration.frame import (
    LEFT,
    RIGHT,
    WIDTH,
    Frame,
    grid,
    halo,
    taken_line,
)
from server.drawing.titration.told import Drawn, Numbers, shape, shapes, volume_words

_TOP, _BOTTOM, _HEIGHT = 30.0, 190.0, 232.0
_MOST_SHAPES = 80


@dataclass(frozen=True, slots=True)
class GranDrawn:
    """A Gran line: volumes, the function over its greatest value, the line's two numbers."""

    method: str
    volume: float
    V: Numbers
    G: Numbers
    intercept: float
    gradient: float


def gran_picture(drawn: Drawn, lines: Sequence[GranDrawn]) -> str:
    """Return the lines of both sides, as far as they could be drawn, with their zeros."""
    volumes = [V for one in lines for V in (*one.V, one.volume)]
    frame = Frame(
        along=scale_around(volumes or [0.0], start=LEFT, end=RIGHT, room=0.05, least=1e-3),
        up=Scale(0.0, 1.08, _BOTTOM, _TOP),
    )
    parts = [
        *grid(frame, up_name="Gran's function over its greatest value",
              along_name="titrant, mL", about=3),
        taken_line(frame, drawn.taken.volume if drawn.taken else None),
    ]  # fmt: skip
    taken = drawn.taken.method if drawn.taken else ""
    for one in lines:
        parts += _one(frame, one, taken=one.method == taken)
    parts += _names(frame, lines, taken)
    says = "Gran's lines: " + (
        "; ".join(
            f"{one.method}, {len(one.V)} points from {min(one.V):.2f} to {max(one.V):.2f} mL, "
            f"reaches zero at {volume_words(one.volume)} mL"
            for one in lines
        )
        or "none could be drawn"
    )
    return picture(WIDTH, _HEIGHT, says=f"{says}.", parts=parts, kind="gran")


def _one(frame: Frame, one: GranDrawn, *, taken: bool) -> list[str]:
    every = max(1, len(one.V) // _MOST_SHAPES)
    far = max(one.V, key=lambda V: abs(V - one.volume))
    ends = [frame.at(V, one.intercept + one.gradient * V) for V in (far, one.volume)]
    straight = {"d": "M" + "L".join(f"{x:.1f} {y:.1f}" for x, y in ends),
                "stroke": "currentColor", "stroke-width": 1.3, "class": "chart-curve"}  # fmt: skip
    places = [frame.at(V, G) for V, G in zip(one.V, one.G, strict=True)][::every]
    points = shapes(one.method, places, size=3.2)
    return [points, element("path", straight), shape(one.method, *ends[1], size=5, taken=taken)]


def _names(frame: Frame, lines: Sequence[GranDrawn], taken: str) -> list[str]:
    """Return the names in the mouth of the V, on its wider side."""
    if not lines:
        return []
    x = frame.along.at(sum(one.volume for one in lines) / len(lines))
    left = x > (LEFT + RIGHT) / 2
    at, anchor = (x - 10, "end") if left else (x + 10, "start")
    return [
        halo(
            f"{one.method} {volume_words(one.volume)}",
            at,
            frame.top + 12 + 19 * place,
            anchor=anchor,
            kind="taken-words" if one.method == taken else "soft",
        )
        for place, one in enumerate(lines)
    ]
