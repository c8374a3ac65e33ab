"""Around the end point: the curve drawn large, the slopes, and a lane for every method."""

from collections.abc import Sequence
from statistics import median

from server.drawing.scale import Scale, scale_around
from server.drawing.svg import element, picture, words
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
    volumes_along,
)
from server.drawing.titration.told import Drawn, Marked, shape, slope_words, volume_words

_TOP, _BOTTOM, _LANE, _ROOM = 30.0, 196.0, 25.0, 44.0
_SLOPES_BOTTOM, _SLOPES_HEIGHT = 160.0, 198.0
_MARKS_SHARE = 2.8
"""The marks fill this part of the width, so that their names have room on both sides."""
_LEAST_STEPS, _MOST_STEPS = 4.0, 14.0


def span(drawn: Drawn) -> Scale:
    """Return the scale of the volumes around the end point: wide enough for all marks and steps."""
    main = drawn.taken or (drawn.marks[0] if drawn.marks else None)
    middle = main.volume if main else (drawn.V[0] + drawn.V[-1]) / 2
    near = sorted(abs(V - middle) for V in drawn.V)[:7]
    step = max(median(near) / 2, 1e-4)
    farthest = max((abs(one.volume - middle) + 2 * one.u for one in drawn.marks), default=step)
    reach = min(max(_MARKS_SHARE * farthest, _LEAST_STEPS * step), _MOST_STEPS * step)
    return Scale(low=middle - reach, high=middle + reach, start=LEFT, end=RIGHT)


def near_end_point(drawn: Drawn) -> str:
    """Return the curve around the end point, and under it each method's volume with ± 2 u."""
    along = span(drawn)
    seen = [at for at, V in enumerate(drawn.V) if along.low <= V <= along.high]
    about = _with_neighbours(seen, len(drawn.V))
    frame = Frame(along, _up([drawn.y[at] for at in about if at not in drawn.aside]))
    good = [frame.at(drawn.V[at], drawn.y[at]) for at in seen if at not in drawn.aside]
    lanes = [one for one in drawn.marks if along.low <= one.volume <= along.high]
    under = Frame(along, Scale(0.0, 1.0, _BOTTOM + 12 + _LANE * len(lanes), _TOP))
    parts = [
        *grid(frame, up_name=drawn.kind, along_name=None),
        taken_line(under, drawn.taken.volume if drawn.taken else None),
        _line(drawn, frame, seen),
        dots(good, width=5.5),
        crosses(frame.at(drawn.V[at], drawn.y[at]) for at in seen if at in drawn.aside),
        *_lanes(frame, lanes),
        *volumes_along(under, "titrant, mL"),
    ]
    says = "Around the end point, with ± 2 u: " + "; ".join(
        f"{one.method} {volume_words(one.volume)} ± {2 * one.u:.4f} mL" for one in lanes
    )
    return picture(WIDTH, under.bottom + _ROOM, says=f"{says}.", parts=parts, kind="near-curve")


def _up(values: Sequence[float]) -> Scale:
    return scale_around(list(values) or [0.0], start=_BOTTOM, end=_TOP, room=0.08, least=1e-3)


def _with_neighbours(seen: Sequence[int], size: int) -> list[int]:
    """Return the points seen, or where they are few the nearest beyond them too."""
    if len(seen) >= 4 or not seen:
        return list(seen)
    return list(range(max(seen[0] - 1, 0), min(seen[-1] + 2, size)))


def _line(drawn: Drawn, frame: Frame, seen: Sequence[int]) -> str:
    """Return the fitted line between the edges, or the points joined where there is no fit."""
    if drawn.model is None:
        joined = [at for at in seen if at not in drawn.aside]
        return line([frame.at(drawn.V[at], drawn.y[at]) for at in joined], kind="joined")
    inside = [
        frame.at(V, y) for V, y in zip(*drawn.model, strict=True)
        if frame.holds(V) and frame.up.low <= y <= frame.up.high
    ]  # fmt: skip
    return line(inside)


def _lanes(frame: Frame, marks: Sequence[Marked]) -> list[str]:
    parts: list[str] = []
    for place, one in enumerate(marks):
        y = frame.bottom + 12 + _LANE * (place + 0.5)
        x, low, high = (
            frame.along.at(value)
            for value in (one.volume, one.volume - 2 * one.u, one.volume + 2 * one.u)
        )
        low, high = max(low, LEFT), min(high, RIGHT)
        rule = {"x1": LEFT, "x2": RIGHT, "y1": y, "y2": y, "stroke": "#ded8ca",
                "class": "chart-rule"}  # fmt: skip
        reach = {"d": f"M{low:.2f} {y:.2f}H{high:.2f}M{low:.2f} {y - 4:.2f}v8"
                      f"M{high:.2f} {y - 4:.2f}v8",
                 "stroke": "currentColor", "stroke-width": 1.6, "fill": "none",
                 "class": "chart-reach"}  # fmt: skip
        kind = "taken-words" if one.taken else "soft"
        parts += [
            element("line", rule),
            element("path", reach),
            shape(one.method, x, y, taken=one.taken),
            halo(one.method, LEFT + 2, y + 4, kind=kind),
            halo(volume_words(one.volume), RIGHT, y + 4, anchor="end", kind=f"{kind} is-digits"),
        ]
    return parts


def slopes_near(drawn: Drawn, slopes: Sequence[tuple[float, float, float]]) -> str:
    """Return the slope of each step around the end point; ``slopes`` are from, to, and slope."""
    along = span(drawn)
    seen = [one for one in slopes if one[1] >= along.low and one[0] <= along.high]
    heights = [0.0, *(height for *_, height in seen)]
    up = scale_around(heights, start=_SLOPES_BOTTOM, end=_TOP, room=0.06, least=1e-6)
    frame = Frame(along, Scale(0.0, up.high, _SLOPES_BOTTOM, _TOP) if min(heights) >= 0 else up)
    steepest = max(seen, key=lambda one: one[2], default=None)
    parts = [
        *grid(frame, up_name=f"steepness, {drawn.kind} per mL", along_name="titrant, mL", about=3),
        _steps(frame, seen),
        taken_line(frame, drawn.taken.volume if drawn.taken else None),
    ]
    says = "No step lies here."
    if steepest:
        says = (
            f"Steepness of each step around the end point: greatest {slope_words(steepest[2])} "
            f"{drawn.kind} per mL between {steepest[0]:.3f} and {steepest[1]:.3f} mL."
        )
        parts.append(
            words(f"greatest {slope_words(steepest[2])}", RIGHT, _TOP - 10, anchor="end", size=11)
        )
    return picture(WIDTH, _SLOPES_HEIGHT, says=says, parts=parts, kind="slopes")


def _steps(frame: Frame, slopes: Sequence[tuple[float, float, float]]) -> str:
    """Return the outline of the steps: each slope as wide as the step it was read on."""
    if not slopes:
        return ""
    d: list[str] = []
    for low, high, height in slopes:
        x1, y = frame.at(max(low, frame.along.low), height)
        x2, _ = frame.at(min(high, frame.along.high), height)
        d.append(f"{'L' if d else 'M'}{x1:.1f} {y:.1f}H{x2:.1f}")
    first = d[0][1:].split(" ")[0]
    y = frame.at(frame.along.low, 0.0)[1]
    shade = {"d": f"M{first} {y:.1f}L{''.join(d)[1:]}V{y:.1f}z", "fill": "#eef0ec",
             "class": "chart-shade"}  # fmt: skip
    outline = {"d": "".join(d), "stroke": "currentColor", "stroke-width": 1.4, "fill": "none",
               "class": "chart-curve"}  # fmt: skip
    return element("path", shade) + element("path", outline)
