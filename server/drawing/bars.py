"""Budget bars: what an uncertainty is made of, longest first."""

from collections.abc import Sequence
from dataclasses import dataclass
from textwrap import wrap

from server.drawing.svg import element, picture, words

_WIDTH, _ROW, _BAR, _LEGEND = 420.0, 42.0, 12.0, 26.0
_LINE, _MOST_LETTERS = 18.0, 42
_HATCH = 7.0


@dataclass(frozen=True, slots=True)
class Bar:
    """One source: its share of the variance in percent, and whether all replicates share it."""

    label: str
    share_percent: float
    shared: bool


def budget_bars(bars: Sequence[Bar]) -> str:
    """Return the picture of the shares, longest first; striped where replicates share the source.

    The longest bar fills the width, so that lengths compare with one another.
    """
    ordered = sorted(bars, key=lambda bar: -bar.share_percent)
    longest = max((bar.share_percent for bar in ordered), default=0.0)
    parts: list[str] = []
    top = 0.0
    for bar in ordered:
        width = _WIDTH * bar.share_percent / longest if longest > 0 else 0.0
        # the share stands at the right of the first line; a long label takes further lines
        lines = wrap(bar.label, _MOST_LETTERS) or [""]
        below = top + _LINE * (len(lines) - 1)
        parts += [
            *(
                words(line, 0, top + 15 + _LINE * i, size=14, kind="words")
                for i, line in enumerate(lines)
            ),
            words(_share(bar), _WIDTH, top + 15, anchor="end", size=14, kind="digits"),
            _bar(below + 22, max(width, 1.5), shared=bar.shared),
        ]
        top = below + _ROW
    height = max(top, _ROW)
    if any(bar.shared for bar in ordered):
        parts.append(words("Striped: the same in every replicate.", 0, height + 16, size=12.5))
        height += _LEGEND
    return picture(_WIDTH, height, says=_says(ordered), parts=parts, kind="bars")


def _bar(y: float, width: float, *, shared: bool) -> str:
    box = {"x": 0.75, "y": y, "width": max(width - 1.5, 1.0), "height": _BAR, "rx": 2}
    if not shared:
        return element("rect", {**box, "fill": "currentColor", "class": "chart-ink"})
    outline = {
        **box,
        "fill": "none",
        "stroke": "currentColor",
        "stroke-width": 1.5,
        "class": "chart-stripe",
    }
    stripes = {
        "d": _stripes(y, width),
        "stroke": "currentColor",
        "stroke-width": 2.4,
        "class": "chart-stripe",
    }
    return element("g", {}, element("rect", outline), element("path", stripes))


def _stripes(y: float, width: float) -> str:
    """Slanted strokes cut off at the bar's ends: no pattern, so no id to clash on a page."""
    strokes = []
    at = -_BAR + _HATCH
    while at < width:
        left, right = max(at, 0.0), min(at + _BAR, width)
        if right > left:
            low, high = y + _BAR - (left - at), y + _BAR - (right - at)
            strokes.append(f"M{left:.1f} {low:.1f}L{right:.1f} {high:.1f}")
        at += _HATCH
    return "".join(strokes) or f"M0 {y:.1f}"


def _share(bar: Bar) -> str:
    return "< 1 %" if 0 <= bar.share_percent < 0.5 else f"{bar.share_percent:.0f} %"


def _says(bars: Sequence[Bar]) -> str:
    if not bars:
        return "No uncertainty budget yet."
    each = ", ".join(
        f"{bar.label} {_share(bar)}{' (shared by the replicates)' if bar.shared else ''}"
        for bar in bars
    )
    return f"Shares of the variance: {each}."
