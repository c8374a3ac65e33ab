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
from server.drawing.titration.told import Drawn, Numbers, shape, volume_words

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
    for one in lines:
        parts += _one(
            frame, one, taken=drawn.taken is not None and drawn.taken.method == one.method
        )
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
    points = [
        shape(one.method, *frame.at(V, G), size=3.2)
        for V, G in list(zip(one.V, one.G, strict=True))[::every]
    ]
    x, y = ends[1]
    before = far < one.volume
    text = f"{one.method} {volume_words(one.volume)}"
    # above the foot of the line, on its empty side
    at = x - 14 if before else min(x + 14, RIGHT - 150)
    up = y - 14 if before else y - 14
    kind = "taken-words" if taken else "soft"
    return [
        *points,
        element("path", straight),
        shape(one.method, x, y, size=5, taken=taken),
        halo(text, at, up, anchor="end" if before else "start", kind=kind),
    ]
