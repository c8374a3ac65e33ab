"""From an analysis to what the pictures of a curve are told."""

from collections.abc import Iterator

import numpy as np

from server.chemistry.electrode import nernst_slope_mV
from server.curves.analysis import Analysis
from server.curves.model.fit import PIVOT_pH
from server.curves.model.line import fitted_line
from server.curves.outcome import EndPoint
from server.curves.points import TitrationCurve
from server.drawing.titration.gran import GranDrawn, gran_picture
from server.drawing.titration.near import near_end_point, slopes_near
from server.drawing.titration.residuals import residuals_picture
from server.drawing.titration.told import Drawn, Marked
from server.drawing.titration.whole import whole_curve
from server.sheets.curves import CurvePictures

NOTHING_DRAWN = CurvePictures("", "", "", "", "")
Steps = tuple[tuple[float, float, float], ...]


def drawn_of(analysis: Analysis, taken: str) -> Drawn:
    """Return a curve with its marks, the method that counts among them."""
    curve = analysis.curve
    return Drawn(
        kind=curve.kind,
        V=tuple(curve.V.tolist()),
        y=tuple(curve.y.tolist()),
        aside=frozenset(_aside(analysis)),
        model=_model(analysis),
        marks=tuple(
            Marked(one.method, one.volume_mL, one.u_mL, taken=one.method == taken)
            for one in analysis.outcomes
            if isinstance(one, EndPoint)
        ),
    )


def pictures_of(analysis: Analysis, drawn: Drawn, *, says: str) -> CurvePictures:
    """Return all pictures of a curve, the whole one told as ``says``."""
    residuals = residuals_of(analysis)
    gran = gran_of(analysis)
    return CurvePictures(
        whole=whole_curve(drawn, says=says),
        residuals=residuals_picture(drawn, residuals) if residuals is not None else "",
        near=near_end_point(drawn),
        slopes=slopes_near(drawn, steps_of(analysis)),
        gran=gran_picture(drawn, gran) if gran else "",
    )


def residuals_of(analysis: Analysis) -> tuple[float, ...] | None:
    """Return each point's residual over its scatter, None without a fit."""
    if analysis.fitted is None:
        return None
    return tuple(np.nan_to_num(analysis.fitted.fit.standardized).tolist())


def gran_of(analysis: Analysis) -> tuple[GranDrawn, ...]:
    """Return the Gran lines that could be laid."""
    return tuple(
        GranDrawn(
            method=one.end_point.method,
            volume=one.end_point.volume_mL,
            V=tuple(one.V.tolist()),
            G=tuple(one.G.tolist()),
            intercept=one.intercept,
            gradient=one.gradient,
        )
        for one in analysis.gran
    )


def steps_of(analysis: Analysis) -> Steps:
    """Return each step of the clean curve: from, to (mL), and its steepness."""
    V, y = analysis.clean.V, analysis.clean.y
    return tuple(
        zip(V[:-1].tolist(), V[1:].tolist(), (np.diff(y) / np.diff(V)).tolist(), strict=True)
    )


def _aside(analysis: Analysis) -> Iterator[int]:
    yield from analysis.clean.bubbles
    if analysis.fitted is not None:
        yield from (int(at) for at in np.flatnonzero(analysis.fitted.fit.trust < 0.5))


def _model(analysis: Analysis) -> tuple[tuple[float, ...], tuple[float, ...]] | None:
    if analysis.fitted is None:
        return None
    V, pH = fitted_line(analysis.fitted.fit)
    inside = (analysis.curve.V[0] <= V) & (analysis.curve.V[-1] >= V) & np.isfinite(V)
    if np.count_nonzero(inside) < 2:
        return None
    y = _as_read(analysis.curve, pH[inside], analysis.fitted.fit.balance.flask.temperature_C)
    return tuple(V[inside].tolist()), tuple(y.tolist())


def _as_read(curve: TitrationCurve, pH: np.ndarray, temperature_C: float) -> np.ndarray:
    if curve.kind == "pH":
        return pH
    return np.asarray((PIVOT_pH - pH) * nernst_slope_mV(temperature_C))
