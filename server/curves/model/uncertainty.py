"""The standard uncertainty of the fitted end point: the fit's own scatter and the model's part.

The fit's part is what the scatter of the points does to the effective volume, enlarged where the
residuals follow each other or stand out by more than the scatter that was given. The model's part
moves each thing that the model takes as known by its own u and lets the parameters follow.
"""

from dataclasses import dataclass

import numpy as np

from server.chemistry.equilibria import CARBONIC, U_PKW
from server.curves.model.fit import ModelFit
from server.curves.points import Floats

_FLASK_VOLUME_U = 0.02
"""u of the volume in the flask as a fraction: measuring cylinder and rinsing."""
_TEMPERATURE_U_K = 0.5
_PKW_PER_K = 0.033
_OTHER_DAVIES_SLOPE = 0.1
"""Davies' coefficient of the linear term was 0.2 in 1938 and 0.3 in 1962: the difference."""


@dataclass(frozen=True, slots=True)
class EndPointUncertainty:
    """Standard uncertainty of the effective volume in mL, and what it is made of.

    ``correlation`` is the factor by which residuals that follow each other enlarge the variance of
    the fit, ``chi2`` the residuals' variance over the scatter that was taken.
    """

    fit_mL: float
    model_mL: float
    parts: tuple[tuple[str, float], ...]
    correlation: float
    chi2: float

    @property
    def u_mL(self) -> float:
        """Both parts together, in mL."""
        return float(np.hypot(self.fit_mL, self.model_mL))


def neighbours_correlation(residuals: Floats) -> float:
    """Return the correlation of each residual with the next, bounded by -1 and 1."""
    centred = residuals - residuals.mean()
    total = float(centred @ centred)
    return float(centred[1:] @ centred[:-1]) / total if total > 0 else 0.0


def _correlation_factor(residuals: Floats) -> float:
    """Return how much residuals that follow each other enlarge a mean's variance, at least 1.

    Twice the sum of the correlations as long as each is larger than chance allows.
    """
    centred = residuals - residuals.mean()
    total, n = float(centred @ centred), residuals.size
    factor = 1.0
    for apart in range(1, n // 4):
        r = float(centred[apart:] @ centred[:-apart]) / total if total > 0 else 0.0
        if r <= 2.5 / n**0.5:
            break
        factor += 2 * r
    return factor


def end_point_uncertainty(
    fit: ModelFit, *, others: tuple[tuple[str, float], ...] = ()
) -> EndPointUncertainty:
    """Return u of a fit's effective volume; ``others`` are further parts of the model in mL."""
    trusted = fit.trust > 0.5
    residuals = fit.standardized[trusted]
    free = max(int(trusted.sum()) - len(fit.names), 1)
    chi2 = float(residuals @ residuals) / free if fit.scatter_given else 1.0
    correlation = _correlation_factor(residuals)
    scale = max(1.0, chi2) * correlation
    fitted = float(np.sqrt(scale * fit.data_covariance[0, 0]))
    parts = (*_priors(fit), *_moved(fit), ("weights", _other_weights(fit)), *others)
    model = float(np.sqrt(sum(one * one for _, one in parts)))
    return EndPointUncertainty(fitted, model, parts, correlation, chi2)


def _priors(fit: ModelFit) -> list[tuple[str, float]]:
    """Return what each prior's width leaves in the effective volume, in mL."""
    reach = np.abs(fit.covariance[0]) * np.sqrt(fit.precision_of_priors)
    words = {"flask_carbonate": "carbonate in the flask's water", "carbonate": "carbonate"}
    return [
        (f"prior of {words.get(name, name)}", float(part))
        for name, part in zip(fit.names, reach, strict=True)
        if part > 0
    ]


def _moved(fit: ModelFit) -> list[tuple[str, float]]:
    """Return the shift in mL for each thing taken as known, moved by its u."""
    balance, found, chemistry = fit.balance, fit.volumes, fit.chemistry
    pull = fit.covariance[0] @ (fit.rows * fit.weights)
    flask = _FLASK_VOLUME_U * balance.flask.volume_mL
    pKw = float(np.hypot(U_PKW, _PKW_PER_K * _TEMPERATURE_U_K))
    moved = [
        ("flask volume", balance.per_flask_volume(found) * flask),
        ("pKw and temperature", balance.per_pKw(found) * pKw),
    ]
    if balance.system.takes_up_carbonate:
        moved += [
            (
                f"pK{step + 1} of carbonic acid",
                balance.per_carbonic_pK(found, chemistry, step)
                * float(np.hypot(CARBONIC[step].u, 0.01)),
            )
            for step in (0, 1)
        ]
    if balance.activities:
        strength = balance.ionic_strength(found, chemistry, found.V)
        other = fit.ln_gamma - balance.davies_A * _OTHER_DAVIES_SLOPE * strength
        there = balance.at(fit.latent_pH, chemistry, ln_gamma=other)
        moved.append(("activity model", there.V - found.V))
    return [(name, abs(float(pull @ change))) for name, change in moved]


def _other_weights(fit: ModelFit) -> float:
    """Return the shift in mL when volumes are taken to scatter by a third less, or half more.

    Half more is at least 1 µL: less than that the points hardly tell from nothing.
    """
    steep2 = np.square(fit.per_reading)
    shifts = []
    for volume_u in (0.67 * fit.volume_u, max(1.5 * fit.volume_u, 1e-3)):
        weights = fit.trust / (steep2 * fit.reading_u**2 + volume_u**2)
        weighted = fit.rows * weights
        normal = weighted @ fit.rows.T + np.diag(fit.precision_of_priors)
        pull = (weighted - fit.rows * fit.weights) @ fit.off_mL
        shifts.append(float(np.linalg.solve(normal, pull)[0]))
    return max(abs(one) for one in shifts)
