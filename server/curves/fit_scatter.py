"""What a model fit is given beforehand, and how it learns the scatter of readings and volumes."""

from dataclasses import dataclass, field

import numpy as np

from server.curves.lag import LagModel
from server.curves.points import Floats

_ENOUGH, _FAR = 4.0, 10.0
"""A residual within 4 standard deviations has full weight; at 10 a point weighs nothing."""
_STANDS = 0.1
"""A change below this fraction leaves the parameters where they are, as far as shows."""
_LEAST_READING_U = 5e-4
_LEAST_VOLUME_U = 2e-6


@dataclass(frozen=True, slots=True)
class Priors:
    """What is known of the parameters beforehand, as standard uncertainties about their values.

    ``slope`` about 1, ``offset`` about 0 (pH), ``carbonate`` (amount per amount of alkalinity)
    about 0, wide enough to leave it free; ``flask_carbonate`` in mmol with its u.
    """

    slope: float = 0.05
    offset: float = 0.3
    carbonate: float = 0.02
    flask_carbonate: float = 0.0
    u_flask_carbonate: float = 3.5e-4


@dataclass(frozen=True, slots=True)
class Given:
    """What a fit is given: priors, scatter where it is known, guesses of it where it is not.

    ``reading_u`` (pH) and ``volume_u`` (mL) of one point, None: learnt from the residuals, from
    the guesses on. ``trust`` gives points that are known to stand off a lower weight, 0 to 1.
    With ``lag`` the probe's lag is fitted too, and the readings are taken from it.
    """

    priors: Priors = field(default_factory=Priors)
    reading_u: float | None = None
    volume_u: float | None = None
    reading_guess: float = 0.01
    volume_guess: float = 0.002
    trust: Floats | None = None
    lag: LagModel | None = None


class ScatterEstimate:
    """Standard deviations of reading and volume and the trust in each point, renewed each round.

    The variances are those that make the squared residuals, over one less leverage, most likely
    (one step of Fisher scoring a round). Points that stand far off have no say.
    """

    def __init__(self, given: Given, points: int) -> None:
        self._given = given
        self._known = np.ones(points) if given.trust is None else given.trust
        self.trust = self._known
        self.reading_u = given.reading_u or max(given.reading_guess, _LEAST_READING_U)
        self.volume_u = given.volume_guess if given.volume_u is None else given.volume_u

    def variance(self, steep2: Floats) -> Floats:
        """Return the effective variance in mL2; ``steep2`` is (dV/d(reading))^2."""
        return steep2 * self.reading_u**2 + self.volume_u**2

    def judge(self, left: Floats, steep2: Floats, variance: Floats, leverage: Floats) -> bool:
        """Renew both standard deviations and the trust; tell whether they stand as they were."""
        reading_u, volume_u = self.reading_u, self.volume_u
        freed = left * left / np.maximum(1 - leverage, 0.05)
        distance2 = freed / variance
        middle = distance2.size // 2
        usual2 = max(1.0, float(np.partition(distance2, middle)[middle]) / 0.4549)
        farthest = float(distance2.max())
        use = None
        if farthest > _ENOUGH**2 * usual2:
            far = np.sqrt(distance2 / usual2)
            use = far <= _ENOUGH
            lowered = np.clip((_FAR - far) / (_FAR - _ENOUGH), 0, 1) * _ENOUGH / far.clip(1)
            self.trust = self._known * np.where(use, 1.0, lowered)
        else:
            self.trust = self._known
        if self._known.min() < 1:
            use = self.trust == 1
        if self._given.reading_u is None:
            self._score(freed, steep2, variance, use)
        least = float(variance.min())
        return (
            abs(self.reading_u - reading_u) <= _STANDS * reading_u
            and abs(self.volume_u**2 - volume_u**2) <= _STANDS * least
        )

    def _score(self, freed: Floats, steep2: Floats, variance: Floats, use: Floats | None) -> None:
        """Take one step of Fisher scoring for the two variances."""
        share = 1 / (variance * variance)
        if use is not None:
            share *= use
        slanted = steep2 * share
        aa, ab, a = float(steep2 @ slanted), float(slanted.sum()), float(freed @ slanted)
        if self._given.volume_u is None:
            bb, b = float(share.sum()), float(freed @ share)
            determinant = aa * bb - ab * ab
            volume = (b * aa - a * ab) / determinant if determinant > 0 else 0.0
            volume = min(max(volume, self.volume_u**2 / 400), self.volume_u**2 * 16)
            self.volume_u = max(volume, _LEAST_VOLUME_U**2) ** 0.5
        reading = max((a - ab * self.volume_u**2) / aa, _LEAST_READING_U**2)
        self.reading_u = min(max(reading**0.5, self.reading_u / 4), self.reading_u * 4)
