"""What a model fit is given beforehand, and how it learns the scatter of readings and volumes."""

from dataclasses import dataclass, field

import numpy as np

from server.curves.lag import LagModel
from server.curves.points import Floats

_ENOUGH, _FAR = 4.0, 10.0
"""A residual within 4 standard deviations has full weight; at 10 a point weighs nothing."""
_CONTRADICTS = 1.2816
"""Quantile of the normal distribution: at 10 % the jump contradicts that volumes are exact."""
_STANDS = 0.1
"""A change below this fraction leaves the parameters where they are, as far as shows."""
_LEAST_READING_U = 5e-4
_LEAST_VOLUME_U = 2e-6
_ALLOWED_VOLUME_U = 3e-3
"""Volumes that scatter by this (mL) do not make a point stand far off while they count as exact."""


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

    Volumes are taken as exact until the points of the jump contradict it; from then on both
    variances are those that make the squared residuals, over one less leverage, most likely (one
    step of Fisher scoring a round). Points that stand far off have no say.
    """

    def __init__(self, given: Given, points: int) -> None:
        self._given = given
        self._known = np.ones(points) if given.trust is None else given.trust
        self._some_known = given.trust is not None
        self.trust = self._known
        self.reading_u = given.reading_u or max(given.reading_guess, _LEAST_READING_U)
        self.volume_u = given.volume_guess if given.volume_u is None else given.volume_u
        self._stage = "given" if given.volume_u is not None else "guess"
        self.volume_dof = np.inf
        """Degrees of freedom of the volumes' scatter where it was learnt."""

    def variance(self, steep2: Floats) -> Floats:
        """Return the effective variance in mL2; ``steep2`` is (dV/d(reading))^2."""
        return steep2 * self.reading_u**2 + self.volume_u**2

    def judge(self, left: Floats, steep2: Floats, variance: Floats, leverage: Floats) -> bool:
        """Renew both standard deviations and the trust; tell whether they stand as they were."""
        reading_u, volume_u = self.reading_u, self.volume_u
        freed = left * left / np.maximum(1 - leverage, 0.05)
        if self._stage == "exact":
            variance = variance + _ALLOWED_VOLUME_U**2
        distance2 = freed / variance
        middle = distance2.size // 2
        usual2 = max(1.0, float(np.partition(distance2, middle)[middle]) / 0.4549)
        use = self._trusted(distance2, usual2)
        if self._stage in ("guess", "learnt"):
            self._score_both(freed, steep2, variance, use)
        elif self._given.reading_u is None:
            self._score_reading(freed, steep2, variance, use)
        if self._stage == "guess":
            self._stage, self.volume_u = "exact", _LEAST_VOLUME_U
            self.volume_dof = np.inf
            return False
        if self._stage == "exact" and self._contradicted(left, steep2, leverage, use):
            self._stage, self.volume_u = "learnt", self._given.volume_guess
            return False
        least = float(variance.min())
        return (
            abs(self.reading_u - reading_u) <= _STANDS * reading_u
            and abs(self.volume_u**2 - volume_u**2) <= _STANDS * least
        )

    def _trusted(self, distance2: Floats, usual2: float) -> Floats | None:
        """Lower the trust in points that stand far off; return which to learn from, None: all."""
        self.trust = self._known
        use = self._known == 1 if self._some_known else None
        if float(distance2.max()) > _ENOUGH**2 * usual2:
            far = np.sqrt(distance2 / usual2)
            near = far <= _ENOUGH
            lowered = np.clip((_FAR - far) / (_FAR - _ENOUGH), 0, 1) * _ENOUGH / far.clip(1)
            self.trust = self._known * np.where(near, 1.0, lowered)
            use = near if use is None else near & use
        return use

    def _contradicted(
        self, left: Floats, steep2: Floats, leverage: Floats, use: Floats | None
    ) -> bool:
        """Tell whether the residuals at the jump are larger than the readings' scatter explains.

        A chi-squared test at 10 % over the points whose reading would tell the volume to 3 µL.
        """
        expected = steep2 * self.reading_u**2
        steep = expected < _ALLOWED_VOLUME_U**2
        if use is not None:
            steep &= self._known > 0
        free = float((1 - leverage[steep]).sum())
        if free < 0.5:
            return False
        chi2 = float((left[steep] ** 2 / expected[steep]).clip(max=25.0).sum())
        ninth = 2 / (9 * free)
        return chi2 > free * (1 - ninth + _CONTRADICTS * ninth**0.5) ** 3

    def _score_reading(
        self, freed: Floats, steep2: Floats, variance: Floats, use: Floats | None
    ) -> None:
        """Learn the readings' scatter alone, away from the jump."""
        share = steep2 / (variance * variance)
        if use is not None:
            share *= use
        reading = float((freed - self.volume_u**2) @ share) / float(steep2 @ share)
        self._move_reading(reading)

    def _score_both(
        self, freed: Floats, steep2: Floats, variance: Floats, use: Floats | None
    ) -> None:
        """Take one step of Fisher scoring for the two variances."""
        share = 1 / (variance * variance)
        if use is not None:
            share *= use
        slanted = steep2 * share
        aa, ab, bb = float(steep2 @ slanted), float(slanted.sum()), float(share.sum())
        a, b = float(freed @ slanted), float(freed @ share)
        determinant = aa * bb - ab * ab
        volume = (b * aa - a * ab) / determinant if determinant > 0 else 0.0
        volume = min(max(volume, self.volume_u**2 / 16), self.volume_u**2 * 16)
        self.volume_u = max(volume, _LEAST_VOLUME_U**2) ** 0.5
        if self._given.reading_u is None:
            self._move_reading((a - ab * self.volume_u**2) / aa)
        self.volume_dof = self.volume_u**4 * determinant / aa

    def _move_reading(self, reading2: float) -> None:
        reading = max(reading2, _LEAST_READING_U**2) ** 0.5
        self.reading_u = min(max(reading, self.reading_u / 4), self.reading_u * 4)
