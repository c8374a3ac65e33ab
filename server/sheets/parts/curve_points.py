"""The points of a curve as a table, in parts, with what each method used."""

from collections.abc import Iterator

from server.curves.analysis import Analysis
from server.curves.outcome import EndPoint
from server.drawing.titration.told import slope_words
from server.lab.curve_entry import CurveEntry
from server.sheets.curves import CurvePoint, PointsPart

ROWS = 60
_SHORT = {
    "steepest segment": "segment",
    "first derivative": "first",
    "second derivative": "second",
    "gran acid side": "Gran acid",
    "gran alkaline side": "Gran alkaline",
    "model fit": "fit",
}


def points_part(
    curve: CurveEntry, analysis: Analysis | None, *, first: int | None, url: str
) -> PointsPart:
    """Return sixty points from ``first`` on (counted from 1).

    Without a first point it is the part in which the curve jumps.
    """
    size = len(curve.volume_mL)
    jump = analysis.clean.at[analysis.jump] if analysis is not None else 0
    begin = (jump if first is None else min(max(first, 1), size) - 1) // ROWS * ROWS
    return PointsPart(
        rows=tuple(_rows(curve, analysis, begin, min(begin + ROWS, size))),
        timed=curve.seconds is not None,
        fitted=analysis is not None and analysis.fitted is not None,
        parts=tuple(
            (f"{low + 1} to {min(low + ROWS, size)}", f"{url}?first={low + 1}#points", low == begin)
            for low in range(0, size, ROWS)
            if size > ROWS
        ),
    )


def _rows(
    curve: CurveEntry, analysis: Analysis | None, begin: int, end: int
) -> Iterator[CurvePoint]:
    used = _used(analysis) if analysis is not None else {}
    aside = set(analysis.clean.bubbles) if analysis is not None else set()
    fit = analysis.fitted.fit if analysis is not None and analysis.fitted else None
    for at in range(begin, end):
        words = list(used.get(at, ()))
        if at in aside:
            words.append("thrown off")
        elif fit is not None and fit.trust[at] < 0.99:
            words.append(f"weight {fit.trust[at]:.2f} in the fit")
        yield CurvePoint(
            number=at + 1,
            volume=curve.volume_mL[at],
            reading=curve.reading[at],
            seconds=curve.seconds[at] if curve.seconds is not None else "",
            slope=_slope(analysis, at),
            residual="" if fit is None else f"{fit.standardized[at]:+.2f}",
            used_by=", ".join(words),
        )


def _slope(analysis: Analysis | None, at: int) -> str:
    """Return the steepness of the step that leads to a point; none leads to the first."""
    if analysis is None or at == 0:
        return ""
    V, y = analysis.curve.V, analysis.curve.y
    step = V[at] - V[at - 1]
    return slope_words((y[at] - y[at - 1]) / step) if step > 0 else ""


def _used(analysis: Analysis) -> dict[int, list[str]]:
    used: dict[int, list[str]] = {}
    for one in analysis.outcomes:
        if isinstance(one, EndPoint):
            for at in one.used:
                used.setdefault(at, []).append(_SHORT[one.method])
    return used
