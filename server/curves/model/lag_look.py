"""Looking for a slow probe in a fitted curve, and taking its lag out where one is certain."""

from dataclasses import dataclass
from typing import Literal

import numpy as np

from server.curves.findings import CurveFinding
from server.curves.model.fit import FitProblem, ModelFit, fit_model
from server.curves.model.lag import LagModel, LagScore, lag_model, lag_score
from server.curves.model.scatter import Given
from server.curves.points import Floats

_SHOWS = 3.5
"""A lag is looked at more closely when the residuals show it by this many u, either way."""
_MISFIT = 2.0
"""Or when readings, with exact volumes, stand off the curve by this factor more in the square."""
_CERTAIN = 4.0
"""A lag counts when it stands this many of its u from nothing,"""
_MUCH_MORE_LIKELY = 15.0
"""and the readings are this much more likely (minus twice the logarithm's difference)."""
_FIRST_SHARES = (0.1, 0.25)
"""Shares still to go that are tried first: where both are less likely than none, there is none."""
_SHARES = tuple(round(0.06 + 0.04 * at, 2) for at in range(22))
"""Shares that are tried where a lag is suspected: the likeliest is a narrow peak."""
_NEARER = (0.02, 0.01)
"""Steps by which the likeliest is then approached."""
_MATTERS = 2e-4
"""A shift of the end point below this fraction of it does not matter."""


@dataclass(frozen=True, slots=True, eq=False)
class LagLook:
    """What came of looking for a lag.

    ``fit`` is the fit to go by: with the lag taken out where times were recorded and it is certain,
    otherwise the one without. ``lag_s`` is the time constant where it was taken out, ``shift_mL``
    what the lag does to the end point, ``part_mL`` what is to be added to u for it.
    """

    fit: ModelFit
    finding: CurveFinding
    lag_s: float | None = None
    shift_mL: float = 0.0
    part_mL: float = 0.0


@dataclass(frozen=True, slots=True, eq=False)
class _Lag:
    """The likeliest lag: the share still to go and its u, the fit with it taken out.

    ``per_share_mL`` is how the end point follows the share, ``gain`` by how much the readings are
    more likely than without.
    """

    share: float
    u: float
    fit: ModelFit
    per_share_mL: float
    gain: float

    @property
    def certain(self) -> bool:
        """Whether it stands clear of its u and makes the readings much more likely."""
        return self.share > _CERTAIN * self.u and self.gain > _MUCH_MORE_LIKELY


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
    suspected = shows or _off_the_curve(fit, thrown_off) > _MISFIT
    if seconds is None and not suspected:
        return LagLook(fit, _nothing(model, score))
    lag = _likeliest(fit, V, model, given, suspected=suspected)
    if lag is None or not lag.certain:
        return LagLook(fit, _unclear(score) if shows else _nothing(model, score))
    return _found(fit, lag, model, V)


def _off_the_curve(fit: ModelFit, thrown_off: tuple[int, ...]) -> float:
    """Return the mean square of what readings stand off the curve over their scatter's.

    None of it is put on the volumes, and points that the fit gave up are counted.
    """
    known = np.delete(np.arange(fit.trust.size), list(thrown_off))
    known = known[fit.per_reading[known] != 0]
    off = fit.off_mL[known] / fit.per_reading[known]
    return float(np.mean(np.square(off).clip(max=1.0))) / fit.reading_u**2


def _step_at(V: Floats, volume_mL: float) -> float:
    """Return the distance of the two points about a volume, in mL."""
    at = int(np.searchsorted(V, volume_mL))
    return float(V[min(at, V.size - 1)] - V[max(at - 1, 0)])


def _likeliest(
    fit: ModelFit, V: Floats, model: LagModel, given: Given, *, suspected: bool
) -> _Lag | None:
    """Return the likeliest lag, None where there is none or no fit with one settles.

    The end point and the lag pull at each other, so the readings are freed of one lag after another
    as if it were known, and the likelihood of the readings as read tells between them.
    """
    tried: dict[float, tuple[float, ModelFit]] = {}
    step_mL = _step_at(V, fit.effective_mL)

    def unlike(share: float) -> float:
        if share not in tried:
            # a lag of so many readings has moved the end point by about as many steps
            start = fit.effective_mL - step_mL * share / (1 - share)
            try:
                one = fit_model(fit.balance, V, model.freed(share), start_mL=start, given=given)
            except (FitProblem, np.linalg.LinAlgError):
                return float(np.inf)
            tried[share] = _unlikeliness_with(one, model, share), one
        return tried[share][0]

    without = _unlikeliness_without(fit)
    if not suspected and all(unlike(one) > without for one in _FIRST_SHARES):
        return None
    best = min(_SHARES, key=unlike)
    step = 0.0
    for step in _NEARER:
        best = min((max(best - step, 0.01), best, best + step), key=unlike)
    step = min(step, best / 2)
    below, here, above = (unlike(one) for one in (best - step, best, best + step))
    bend = below - 2 * here + above
    if not np.isfinite(bend) or bend <= 0:
        return None
    share = best + step * min(max((below - above) / (2 * bend), -1.0), 1.0)
    least = unlike(share)
    if not np.isfinite(least):
        return None
    first, last = (tried[one][1].effective_mL for one in (best - step, best + step))
    return _Lag(
        share=share,
        u=float(step * np.sqrt(2 / bend)),
        fit=tried[share][1],
        per_share_mL=(last - first) / (2 * step),
        gain=without - least,
    )


def _unlikeliness_without(fit: ModelFit) -> float:
    trusted = (fit.trust > 0.5) & (fit.per_reading != 0)
    steep = fit.per_reading[trusted]
    variance = fit.reading_u**2 + np.square(fit.volume_u / steep)
    return _unlikeliness(fit.off_mL[trusted] / steep, variance, int(trusted.sum()), fit)


def _unlikeliness_with(lagged: ModelFit, model: LagModel, share: float) -> float:
    """Return the unlikeliness of the readings as read, by a fit to readings freed of a lag."""
    trusted = lagged.trust > 0.5
    steep = np.where(trusted & (lagged.per_reading != 0), lagged.per_reading, np.inf)
    curve = model.freed(share) - lagged.off_mL / steep
    off = model.readings - model.lagged(share, curve)
    volumes = model.lagged_variance(share, np.square(lagged.volume_u / steep))
    # the freed readings scatter more than those read: the lag's own sum of squares, undone
    reading_u = lagged.reading_u * (1 - share) / float(np.hypot(1, share))
    variance = reading_u**2 + volumes[trusted]
    return _unlikeliness(off[trusted], variance, int(trusted.sum()), lagged)


def _unlikeliness(off: Floats, variance: Floats, trusted: int, fit: ModelFit) -> float:
    """Return minus twice the logarithm of the likelihood, a far-off point counted as one at 5 u.

    Points that a fit gave up count as if they stood that far off a reading's scatter.
    """
    given_up = int((fit.trust > 0).sum()) - trusted
    known = float(np.sum(np.log(variance) + np.minimum(np.square(off) / variance, 25.0)))
    return known + given_up * (25.0 + 2 * float(np.log(fit.reading_u)))


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


def _found(fit: ModelFit, lag: _Lag, model: LagModel, V: Floats) -> LagLook:
    constant, u_constant = model.constant(lag.share), model.per_constant(lag.share) * lag.u
    shift = lag.fit.effective_mL - fit.effective_mL
    step = _step_at(V, lag.fit.effective_mL)
    ratio = lag.share / lag.u
    if model.usual_s is not None:
        says = (
            f"The probe lags by {constant:.2f} s (u {u_constant:.2f} s); the fit has taken it out, "
            f"which moves the end point by {shift:+.3f} mL. Whether a reading stands for the "
            "beginning or the end of its step is not known and is in u."
        )
        finding = CurveFinding("lag", "look", says, "fitted lag", figure=ratio, limit=_CERTAIN)
        part = float(np.hypot(step / (2 * 3**0.5), lag.per_share_mL * lag.u))
        return LagLook(lag.fit, finding, constant, shift, part)
    says = (
        f"The probe lags: at an even pace by about {constant:.1f} readings. No times were "
        f"recorded, so nothing was taken out; the end point of the fit would move by {shift:+.3f} "
        "mL. Record the seconds, or wait for the probe."
    )
    matters = abs(shift) > _MATTERS * fit.effective_mL
    verdict: Literal["look", "fails"] = "fails" if matters else "look"
    finding = CurveFinding("lag", verdict, says, "fitted lag", figure=ratio, limit=_CERTAIN)
    return LagLook(fit, finding, None, shift, abs(shift))
