"""What a model fit is given beforehand, and how it learns the scatter of readings and volumes."""

from dataclasses import dataclass, field

import numpy as np

from server.curves.points import Floats

_ENOUGH, _FAR = 4.0, 10.0
"""A residual within 4 standard deviations has full weight; at 10 a point weighs nothing."""
_STANDS = 0.2
"""A variance that changes by less than this leaves the parameters as they are, for all it shows."""
_LEAST_READING_U = 5e-4
_LEAST_VOLUME_U = 2e-6
_DRAWN_TO, _DRAWN_BY = 4e-4, 2.0
"""Towards which scatter of a volume (mL) the weights' is drawn, and by how many points' worth."""
_NOT_SEEN, _CLEARLY_SEEN = 0.5, 8.0
"""Degrees of freedom below which the volumes' scatter is not seen, and from which it is."""
_MEDIAN_OF_CHI2 = 0.4549
"""Median of chi-squared with one degree of freedom."""


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
    """

    priors: Priors = field(default_factory=Priors)
    reading_u: float | None = None
    volume_u: float | None = None
    reading_guess: float = 0.01
    volume_guess: float = 0.002
    trust: Floats | None = None


class ScatterEstimate:
    """Standard deviations of reading and volume and the trust in each point, renewed each round.

    Where they are not given, the variances are those that make the squared residuals, over one
    less leverage, most likely (one step of Fisher scoring a round). Only the few points of the
    jump tell how volumes scatter; so the weights rest on that estimate drawn towards a small
    value, while u rests on the estimate itself. Points that stand far off have no say.
    """

    def __init__(self, given: Given, points: int) -> None:
        self._given = given
        self._known = np.ones(points) if given.trust is None else given.trust
        self.trust = self._known
        self.reading_u = given.reading_u or max(given.reading_guess, _LEAST_READING_U)
        self.volume_u = given.volume_guess if given.volume_u is None else given.volume_u
        self.volume_seen = self.volume_u**2
        """The volumes' variance (mL2) as the residuals alone have it, widened for their fewness."""

    def variance(self, steep2: Floats) -> Floats:
        """Return the effective variance in mL2; ``steep2`` is (dV/d(reading))^2."""
        return steep2 * self.reading_u**2 + self.volume_u**2

    def judge(self, left: Floats, steep2: Floats, variance: Floats, leverage: Floats) -> bool:
        """Renew both standard deviations and the trust; tell whether they stand as they were."""
        reading_u, volume_u = self.reading_u, self.volume_u
        freed = left * left / np.maximum(1 - leverage, 0.05)
        use = self._trusted(freed / variance)
        if self._given.reading_u is None or self._given.volume_u is None:
            self._score(freed, steep2, variance, use)
        return abs(self.reading_u - reading_u) <= _STANDS * reading_u and abs(
            self.volume_u**2 - volume_u**2
        ) <= _STANDS * float(variance.min())

    def _trusted(self, distance2: Floats) -> Floats | None:
        """Lower the trust in points that stand far off; return which to learn from, None: all."""
        middle = distance2.size // 2
        usual2 = max(1.0, float(np.partition(distance2, middle)[middle]) / _MEDIAN_OF_CHI2)
        self.trust = self._known
        use = None if self._given.trust is None else self._known == 1
        if float(distance2.max()) > _ENOUGH**2 * usual2:
            far = np.sqrt(distance2 / usual2)
            near = far <= _ENOUGH
            lowered = np.clip((_FAR - far) / (_FAR - _ENOUGH), 0, 1) * _ENOUGH / far.clip(1)
            self.trust = self._known * np.where(near, 1.0, lowered)
            use = near if use is None else near & use
        return use

    def _score(self, freed: Floats, steep2: Floats, variance: Floats, use: Floats | None) -> None:
        """Take one step of Fisher scoring for the two variances."""
        share = 1 / (variance * variance)
        if use is not None:
            share *= use
        slanted = steep2 * share
        aa, ab, a = float(steep2 @ slanted), float(slanted.sum()), float(freed @ slanted)
        if self._given.volume_u is None:
            bb, b = float(share.sum()), float(freed @ share)
            drawn = _DRAWN_BY / self.volume_u**4
            volume = _ratio((b + drawn * _DRAWN_TO**2) * aa - a * ab, aa * (bb + drawn) - ab * ab)
            seen = max(_ratio(b * aa - a * ab, aa * bb - ab * ab), 0.0)
            # twice the squared estimate over its variance: 8 is two standard errors from nothing
            dof = seen * seen * (bb - _ratio(ab * ab, aa))
            clear = min(max((dof - _NOT_SEEN) / (_CLEARLY_SEEN - _NOT_SEEN), 0.0), 1.0)
            seen *= 1 + min(1.0, 4 / max(dof, 1e-9))
            self.volume_seen = clear * seen
            volume = min(max(volume, self.volume_u**2 / 100), self.volume_u**2 * 16)
            self.volume_u = max(volume, _LEAST_VOLUME_U**2) ** 0.5
        if self._given.reading_u is None:
            reading = max(_ratio(a - ab * self.volume_u**2, aa), _LEAST_READING_U**2) ** 0.5
            self.reading_u = min(max(reading, self.reading_u / 4), self.reading_u * 4)


def _ratio(over: float, under: float) -> float:
    return over / under if under > 0 else 0.0
