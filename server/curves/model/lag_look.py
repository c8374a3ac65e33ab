"""Looking for a slow probe in a fitted curve, and fitting the lag where one shows."""

from dataclasses import dataclass, replace

import numpy as np

from server.curves.findings import CurveFinding
from server.curves.model.fit import FitProblem, ModelFit, fit_model
from server.curves.model.lag import LagModel, LagScore, lag_model, lag_score
from server.curves.model.scatter import Given
from server.curves.points import Floats

_SHOWS = 3.5
"""A lag is looked at more closely when the residuals show it by this many u, either way."""
_CERTAIN = 4.0
_MISFIT = 2.0
"""Or when, with exact volumes, the readings stand off by this much more than away from the jump."""
_MUCH_MORE_LIKELY = 15.0
"""Minus twice the difference of the logarithms of the likelihoods."""
_STARTS = (0.2, 0.5, 0.75)
"""Shares still to go from which a lag is fitted."""
_MATTERS = 2e-4
"""A shift of the end point below this fraction of it does not matter."""


@dataclass(frozen=True, slots=True, eq=False)
class LagLook:
    """What came of looking for a lag.

    ``fit`` is the fit to go by: with the lag taken out where times were recorded and it is certain,
    otherwise the one without. ``constant`` is the time constant, in seconds or in readings,
    ``shift_mL`` what it does to the end point, ``part_mL`` what is to be added to u for it.
    """

    fit: ModelFit
    finding: CurveFinding
    lag_s: float | None
    shift_mL: float
    part_mL: float


def look_for_lag(
    fit: ModelFit,
    V: Floats,
    readings: Floats,
    *,
    seconds: Floats | None,
    thrown_off: tuple[int, ...],
    given: Given,
) -> LagLook:
    """Return what the residuals of a fit say of a lag of the probe."""
    model = lag_model(readings, seconds, thrown_off)
    score = lag_score(
        rows=fit.rows,
        covariance=fit.covariance,
        weights=fit.weights,
        gap=fit.off_mL,
        per_reading=fit.per_reading,
        curve=readings - fit.off_pH,
        paces=model.paces,
    )
    shows = abs(score.ratio) > _SHOWS
    if seconds is None and not shows and _off_the_curve(fit) <= _MISFIT * fit.reading_u**2:
        return LagLook(fit, _nothing(model, score), None, 0.0, 0.0)
    lagged = _lagged_fit(fit, V, readings, replace(given, lag=model))
    if lagged is None or not _certain(fit, lagged, model):
        finding = _unclear(score) if shows else _nothing(model, score)
        return LagLook(fit, finding, None, 0.0, 0.0)
    return _found(fit, lagged, model, V)


def _lagged_fit(fit: ModelFit, V: Floats, readings: Floats, given: Given) -> ModelFit | None:
    """Return a fit with a lag, from several beginnings; None where none settles."""
    for start in _STARTS:
        lag = None if given.lag is None else replace(given.lag, start=start)
        try:
            return fit_model(
                fit.balance, V, readings, start_mL=fit.effective_mL, given=replace(given, lag=lag)
            )
        except FitProblem:
            continue
    return None


def _off_the_curve(fit: ModelFit) -> float:
    """Return the mean square of what readings stand off the curve, none of it put on volumes."""
    trusted = fit.trust > 0.5
    return float(np.mean(np.square(fit.off_mL / fit.per_reading)[trusted]))


def _certain(fit: ModelFit, lagged: ModelFit, model: LagModel) -> bool:
    """Tell whether a lag stands clear of its u and makes the readings much more likely."""
    share = lagged.value("lag")
    if share <= _CERTAIN * lagged.u("lag"):
        return False
    curve = model.freed(share) - lagged.off_mL / lagged.per_reading
    off = model.readings - model.lagged(share, curve)
    volumes = model.lagged_variance(share, np.square(lagged.volume_u / lagged.per_reading))
    # the freed readings scatter more than those read: the lag's own sum of squares, undone
    reading_u = lagged.reading_u * (1 - share) / float(np.hypot(1, share))
    trusted = (fit.trust > 0.5) & (lagged.trust > 0.5)
    without = _unlikeliness(
        (fit.off_mL / fit.per_reading)[trusted],
        fit.reading_u**2 + np.square(fit.volume_u / fit.per_reading)[trusted],
    )
    with_lag = _unlikeliness(off[trusted], reading_u**2 + volumes[trusted])
    return without - with_lag > _MUCH_MORE_LIKELY


def _unlikeliness(off: Floats, variance: Floats) -> float:
    """Return minus twice the logarithm of the likelihood, a far-off point counted as 5 u."""
    return float(np.sum(np.log(variance) + np.minimum(np.square(off) / variance, 25.0)))


def _nothing(model: LagModel, score: LagScore) -> CurveFinding:
    pace = "with the times recorded" if model.usual_s is not None else "at an even pace"
    says = (
        f"No lag of the probe shows ({pace}): {max(score.share, 0):.2f} of a step is still to go "
        f"when a reading is taken, u {score.u:.2f}."
    )
    return CurveFinding("lag", "holds", says, "score test", figure=abs(score.ratio), limit=_SHOWS)


def _unclear(score: LagScore) -> CurveFinding:
    says = (
        "The residuals follow the pace of the readings, but no lag of the probe explains them. "
        "Waiting longer after each addition would show whether the probe is slow."
    )
    return CurveFinding("lag", "look", says, "score test", figure=abs(score.ratio), limit=_SHOWS)


def _found(fit: ModelFit, lagged: ModelFit, model: LagModel, V: Floats) -> LagLook:
    share, u = lagged.value("lag"), lagged.u("lag")
    constant, u_constant = model.constant(share), model.per_constant(share) * u
    shift = lagged.effective_mL - fit.effective_mL
    at = int(np.searchsorted(V, lagged.effective_mL))
    step = float(V[min(at, V.size - 1)] - V[max(at - 1, 0)])
    ratio = share / u
    if model.usual_s is not None:
        says = (
            f"The probe lags by {constant:.2f} s (u {u_constant:.2f} s); the fit has taken it out, "
            f"which moves the end point by {shift:+.3f} mL. Whether a reading stands for the "
            "beginning or the end of its step is not known and is in u."
        )
        finding = CurveFinding("lag", "look", says, "fitted lag", figure=ratio, limit=_CERTAIN)
        return LagLook(lagged, finding, constant, shift, step / (2 * 3**0.5))
    says = (
        f"The probe lags: at an even pace by about {constant:.1f} readings. No times were "
        f"recorded, so nothing was taken out; the end point of the fit would move by {shift:+.3f} "
        "mL. Record the seconds, or wait for the probe."
    )
    matters = abs(shift) > _MATTERS * fit.effective_mL
    finding = CurveFinding(
        "lag", "fails" if matters else "look", says, "fitted lag", figure=ratio, limit=_CERTAIN
    )
    return LagLook(fit, finding, None, shift, abs(shift))
