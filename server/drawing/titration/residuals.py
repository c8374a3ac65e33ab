"""What the fitted line leaves: each point's distance over the scatter that it should have."""

from collections.abc import Sequence

from server.drawing.scale import Scale
from server.drawing.svg import element, picture, words
from server.drawing.titration.frame import (
    LEFT,
    RIGHT,
    WIDTH,
    Frame,
    crosses,
    dots,
    grid,
    taken_line,
)
from server.drawing.titration.told import Drawn
from server.drawing.titration.whole import whole_along

_TOP, _BOTTOM, _HEIGHT = 30.0, 148.0, 186.0
_LEAST, _MOST = 3.2, 6.0


def residuals_picture(drawn: Drawn, residuals: Sequence[float]) -> str:
    """Return the residuals in units of their scatter; farther ones stand at the edge."""
    counted = [abs(one) for at, one in enumerate(residuals) if at not in drawn.aside]
    reach = min(max(_LEAST, 1.1 * max(counted, default=0.0)), _MOST)
    frame = Frame(whole_along(drawn), Scale(-reach, reach, _BOTTOM, _TOP))
    places = [frame.at(V, off) for V, off in zip(drawn.V, residuals, strict=True)]
    low, high = frame.at(0.0, 2.0)[1], frame.at(0.0, -2.0)[1]
    band = {"x": LEFT, "y": low, "width": RIGHT - LEFT, "height": high - low, "fill": "#eef0ec",
            "class": "chart-shade"}  # fmt: skip
    zero = {"x1": LEFT, "x2": RIGHT, "y1": frame.up.at(0.0), "y2": frame.up.at(0.0),
            "stroke": "currentColor", "class": "chart-curve"}  # fmt: skip
    parts = [
        element("rect", band),
        *grid(frame, up_name="residual, times its scatter", along_name="titrant, mL"),
        element("line", zero),
        taken_line(frame, drawn.taken.volume if drawn.taken else None),
        dots((one for at, one in enumerate(places) if at not in drawn.aside), width=4.4),
        crosses(places[at] for at in sorted(drawn.aside)),
        words("shaded: ± 2", RIGHT, _TOP - 10, anchor="end", size=11),
    ]
    inside = sum(one <= 2 for one in counted)
    says = f"Residuals of the model fit over their scatter: {inside} of {len(counted)} within ± 2."
    if drawn.aside:
        says += f" Crosses: {len(drawn.aside)} that count little or nothing."
    return picture(WIDTH, _HEIGHT, says=says, parts=parts, kind="residuals")
