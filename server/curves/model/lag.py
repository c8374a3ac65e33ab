"""A probe that follows slowly: taking a first-order lag out of the readings, and testing for it.

After an addition the reading moves from where it was towards the true one and is taken when a
share k of the way is still to go: reading = k * reading before + (1 - k) * true reading, with
k = exp(-time between readings / time constant).
"""

from dataclasses import dataclass

import numpy as np

from server.curves.points import Floats


@dataclass(frozen=True, slots=True, eq=False)
class LagModel:
    """The readings of a curve, ready to be freed of a lag.

    ``readings`` in the fit's unit, ``paces`` the times between readings over the usual one (the
    first is not used), ``usual_s`` the usual time in seconds, None where times were not recorded
    and an even pace is assumed.
    """

    readings: Floats
    paces: Floats
    usual_s: float | None

    def shares(self, share: float) -> Floats:
        """Return the share still to go at each reading; 0 at the first."""
        to_go = np.power(share, self.paces)
        to_go[0] = 0.0
        return np.asarray(to_go)

    def freed(self, share: float) -> Floats:
        """Return the readings as a probe without lag would have given them."""
        to_go = self.shares(share)
        before = np.concatenate(([self.readings[0]], self.readings[:-1]))
        return np.asarray((self.readings - to_go * before) / (1 - to_go))

    def lagged(self, share: float, curve: Floats) -> Floats:
        """Return what a probe with this lag reads of a curve."""
        now = float(curve[0])
        seen = [now]
        to_go = self.shares(share)[1:].tolist()
        for true, left in zip(curve[1:].tolist(), to_go, strict=True):
            now = left * now + (1 - left) * true
            seen.append(now)
        return np.array(seen)

    def lagged_variance(self, share: float, variance: Floats) -> Floats:
        """Return the variance of what a probe with this lag reads of independent errors."""
        now = float(variance[0])
        seen = [now]
        to_go = self.shares(share)[1:].tolist()
        for one, left in zip(variance[1:].tolist(), to_go, strict=True):
            now = left * left * now + (1 - left) ** 2 * one
            seen.append(now)
        return np.array(seen)

    def constant(self, share: float) -> float:
        """Return the time constant: in seconds, or in readings where no times were recorded."""
        unit = self.usual_s if self.usual_s is not None else 1.0
        return float(-unit / np.log(share))

    def per_constant(self, share: float) -> float:
        """Return d(time constant)/d(share)."""
        unit = self.usual_s if self.usual_s is not None else 1.0
        return float(unit / (share * np.log(share) ** 2))


def lag_model(readings: Floats, seconds: Floats | None, thrown_off: tuple[int, ...]) -> LagModel:
    """Return the readings ready to be freed of a lag; bubbles are bridged by straight lines."""
    at = np.arange(readings.size)
    keep = np.ones(readings.size, dtype=bool)
    keep[list(thrown_off)] = False
    bridged = np.interp(at, at[keep], readings[keep])
    if seconds is None:
        return LagModel(bridged, np.ones(readings.size), None)
    between = np.diff(seconds, prepend=seconds[0])
    usual = float(np.median(between[1:]))
    if usual <= 0:
        return LagModel(bridged, np.ones(readings.size), None)
    return LagModel(bridged, np.clip(between / usual, 0.01, 100.0), usual)


@dataclass(frozen=True, slots=True)
class LagScore:
    """A lag looked for in the residuals of a fit without one: share still to go, and its u."""

    share: float
    u: float

    @property
    def ratio(self) -> float:
        """How many of its u the share lies above nothing."""
        return self.share / self.u if self.u > 0 else 0.0


def lag_score(
    *,
    rows: Floats,
    covariance: Floats,
    weights: Floats,
    gap: Floats,
    per_reading: Floats,
    curve: Floats,
    paces: Floats,
) -> LagScore:
    """Return what a small lag would explain of a fit's residuals, the parameters following.

    ``curve`` are the fitted readings. Only the pace counts that is even: a pause before a reading
    leaves less of a lag to see.
    """
    rise = np.diff(curve, prepend=curve[0]) * np.exp(-np.maximum(paces - 1, 0))
    row = per_reading * rise
    pulled = row * weights
    onto = covariance @ (rows @ pulled)
    own = float(pulled @ row - (rows @ pulled) @ onto)
    if own <= 0:
        return LagScore(0.0, 0.0)
    return LagScore(float(pulled @ gap) / own, own**-0.5)
