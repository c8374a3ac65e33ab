"""The model fit: all points at once against the charge balance, by Gauss-Newton.

Both coordinates are read with error, so each point has a latent pH. A step is taken for the
parameters with effective-variance weights 1/((dV/dy)^2 s_y^2 + s_V^2), the slope taken at the
latent pH and not at the noisy reading (which would bias the fit), and the latent pH follow. The
two variances are estimated on the way from the residuals, leverage allowed for. Readings that
stand far off are given little weight.
"""

from dataclasses import dataclass

import numpy as np

from server.curves.model.charge_balance import ChargeBalance, Chemistry, Volumes
from server.curves.model.scatter import Given, Priors, ScatterEstimate
from server.curves.points import Floats

PIVOT_pH = 7.0
"""The pH at which a probe's slope does nothing: reading = 7 + offset + slope (pH - 7)."""
_MOST_ROUNDS = 40
_SETTLED = 0.02
"""A step below this fraction of every parameter's standard error ends the fit."""
_PATIENT = 6
"""Rounds after which larger steps end the fit, in proportion to their number."""
_FIRST_JUDGED = 2
"""The round in which scatter and far-off readings are first judged."""
_ROUNDS_OF_ACTIVITIES = 4
"""Rounds in which the activity coefficients follow; later ones move them by nothing that shows."""
_GRID = np.linspace(1.0, 13.2, 62)
"""The pH at which a first guess of the curve is laid out."""
_LONGEST_STEP = {"effective_mL": 0.2, "offset": 0.5, "slope": 0.1, "carbonate": 0.05}
"""No round moves a parameter further than this (the volume: as a fraction of itself)."""


class FitProblem(ValueError):
    """The model fit cannot be made; the words say why."""


@dataclass(frozen=True, slots=True, eq=False)
class ModelFit:
    """A finished fit. ``names`` gives the order of ``values``, ``covariance`` and ``rows``.

    ``rows`` are the derivatives of the volume by the parameters at each point, ``weights`` those of
    the last step in 1/mL2, ``trust`` the factor from 0 to 1 that a far-off point's weight was
    lowered by, ``latent_pH`` the pH that the reading stands for, ``off_mL`` volume read less volume
    of the model at the reading, ``off_pH`` what the reading stands off the curve, ``standardized``
    the residual over its own standard deviation, ``per_reading`` dV/d(reading) in mL.
    """

    balance: ChargeBalance
    names: tuple[str, ...]
    values: Floats
    covariance: Floats
    precision_of_priors: Floats
    rows: Floats
    weights: Floats
    trust: Floats
    latent_pH: Floats
    off_mL: Floats
    off_pH: Floats
    standardized: Floats
    per_reading: Floats
    volumes: Volumes
    ln_gamma: Floats
    reading_u: float
    volume_u: float
    volume_seen_u: float
    scatter_given: bool
    rounds: int
    chemistry: Chemistry

    def value(self, name: str) -> float:
        """Return a parameter's value; ValueError where it is not part of this fit."""
        return float(self.values[self.names.index(name)])

    def u(self, name: str) -> float:
        """Return a parameter's standard uncertainty, priors included."""
        at = self.names.index(name)
        return float(np.sqrt(self.covariance[at, at]))

    @property
    def effective_mL(self) -> float:
        """The volume at which the titrant's effective concentration has met the whole amount."""
        return float(self.values[0])

    @property
    def data_covariance(self) -> Floats:
        """The part of the covariance that comes from the scatter of the points alone."""
        scatter2 = np.square(self.per_reading * self.reading_u) + self.volume_seen_u**2
        pulls = self.covariance @ (self.rows * self.weights)
        return np.asarray((pulls * scatter2 * (self.trust > 0)) @ pulls.T)


class _Rounds:
    """The state that the rounds of a fit carry along."""

    def __init__(self, balance: ChargeBalance, start_mL: float, priors: Priors) -> None:
        system = balance.system
        self.balance = balance
        self.names = ["effective_mL", "offset", "slope"]
        values, widths = [start_mL, 0.0, 1.0], [np.inf, priors.offset, priors.slope]
        for step in system.fitted_steps:
            self.names.append(f"pK{step + 1}")
            values.append(balance.pK[step])
            widths.append(float(np.hypot(system.u_pK, system.analyte[step].u)))
        if system.takes_up_carbonate:
            self.names += ["carbonate", "flask_carbonate"]
            values += [0.0, priors.flask_carbonate]
            widths += [priors.carbonate, priors.u_flask_carbonate]
        self.carbonate_at = 3 + len(system.fitted_steps)
        self.values = np.array(values)
        self.centre = self.values
        self.precision = 1 / np.square(widths)
        self.limits = np.array([_LONGEST_STEP.get(name, 0.3) for name in self.names])
        self.limits[0] *= start_mL

    def chemistry(self) -> Chemistry:
        """Return what the parameters say of the chemistry."""
        system, flask = self.balance.system, self.balance.flask
        values = self.values.tolist()
        pK = list(self.balance.pK)
        for at, step in enumerate(system.fitted_steps):
            pK[step] = values[3 + at]
        at = self.carbonate_at
        f, n0 = values[at : at + 2] if system.takes_up_carbonate else (0.0, 0.0)
        c = flask.amount_mmol * system.protons / (values[0] * (1 - f))
        return Chemistry(tuple(pK), c, f, n0)

    def rows(self, chemistry: Chemistry, found: Volumes, latent: Floats, slope: Floats) -> Floats:
        """Return dV/d(parameter) for each parameter and point; ``slope`` is dV/d(reading)."""
        balance = self.balance
        rows = np.empty((len(self.names), latent.size))
        rows[0] = balance.per_effective(found, float(self.values[0]))
        np.negative(slope, out=rows[1])
        rows[2] = slope * (PIVOT_pH - latent)
        for at, step in enumerate(balance.system.fitted_steps):
            rows[3 + at] = balance.per_pK(found, step)
        if balance.system.takes_up_carbonate:
            rows[self.carbonate_at] = balance.per_carbonate(found, chemistry)
            rows[self.carbonate_at + 1] = balance.per_flask_carbonate(found)
        return rows

    def bounded(self, step: Floats) -> Floats:
        """Return the step, shortened as a whole where it would leave what is reasonable."""
        excess = float(np.abs(step / self.limits).max())
        return step if excess <= 1 else np.asarray(step / excess)


def fit_model(
    balance: ChargeBalance,
    V: Floats,
    pH: Floats,
    *,
    start_mL: float,
    given: Given | None = None,
) -> ModelFit:
    """Return the fit of a curve: volumes V in mL, readings in pH.

    Raises:
        FitProblem: it does not settle, or settles outside what a titration can be.
    """
    asked = given or Given()
    says = "The points do not determine the model's parameters."
    with np.errstate(all="ignore"):
        # a start far from the end point makes a poor first guess of the probe: then without
        for probe_first in (True, False):
            try:
                return _fit(balance, V, pH, start_mL=start_mL, given=asked, probe_first=probe_first)
            except FitProblem as problem:
                says = problem.args[0]
            except (np.linalg.LinAlgError, ZeroDivisionError):
                pass
    raise FitProblem(says)


def _fit(
    balance: ChargeBalance,
    V: Floats,
    pH: Floats,
    *,
    start_mL: float,
    given: Given,
    probe_first: bool,
) -> ModelFit:
    rounds = _Rounds(balance, start_mL, given.priors)
    scatter = ScatterEstimate(given, V.size)
    off_reading = np.zeros_like(V)
    chemistry = rounds.chemistry()
    if probe_first:
        _begin_probe(rounds, chemistry, V, pH, scatter.trust)
    ln_gamma = balance.ln_gamma(balance.start_ionic_strength(V, chemistry.c))
    size = len(rounds.names)
    for count in range(1, _MOST_ROUNDS + 1):
        _, offset, slope = rounds.values[:3].tolist()
        latent = (pH - off_reading) * (1 / slope) + (PIVOT_pH - (PIVOT_pH + offset) / slope)
        found = balance.at(latent, chemistry, ln_gamma=ln_gamma)
        per_reading = found.slope * (1 / slope)
        rows = rounds.rows(chemistry, found, latent, per_reading)
        gap = V - found.V - per_reading * off_reading
        steep2 = per_reading * per_reading
        variance = scatter.variance(steep2)
        weights = scatter.trust / variance
        weighted = rows * weights
        normal = weighted @ rows.T
        normal.ravel()[:: size + 1] += rounds.precision
        covariance: Floats = np.asarray(np.linalg.inv(normal), dtype=float)
        pull = weighted @ gap - rounds.precision * (rounds.values - rounds.centre)
        step = rounds.bounded(covariance @ pull)
        left = gap - step @ rows
        rounds.values = rounds.values + step
        off_reading = per_reading * left * (scatter.reading_u**2 / -variance)
        chemistry = rounds.chemistry()
        if balance.activities and count <= _ROUNDS_OF_ACTIVITIES:
            ln_gamma = balance.ln_gamma(balance.ionic_strength(found, chemistry, V))
        if not np.isfinite(step[0]):
            break
        if count < _FIRST_JUDGED:
            continue
        stands = scatter.judge(left, steep2, variance, (weighted * (covariance @ rows)).sum(axis=0))
        # where the scatter creeps towards its place the parameters creep along: more is allowed
        allowed = _SETTLED * max(1.0, count / _PATIENT)
        if stands and float((step * step / covariance.diagonal()).max()) <= allowed * allowed:
            break
    else:
        raise FitProblem("The fit does not settle: these points are not a curve of this system.")
    _plausible(rounds.values, V)
    return ModelFit(
        balance=balance,
        names=tuple(rounds.names),
        values=rounds.values,
        covariance=covariance,
        precision_of_priors=rounds.precision,
        rows=rows,
        weights=weights,
        trust=scatter.trust,
        latent_pH=latent,
        off_mL=left,
        off_pH=off_reading,
        standardized=left / np.sqrt(variance),
        per_reading=per_reading,
        volumes=found,
        ln_gamma=ln_gamma,
        reading_u=scatter.reading_u,
        volume_u=scatter.volume_u,
        scatter_given=given.reading_u is not None and given.volume_u is not None,
        volume_seen_u=float(scatter.volume_seen) ** 0.5,
        rounds=count,
        chemistry=chemistry,
    )


def _begin_probe(
    rounds: _Rounds, chemistry: Chemistry, V: Floats, pH: Floats, trust: Floats
) -> None:
    """Set offset and slope to those of the line of the readings on the pH of a first guess.

    A probe that reads half a pH too high would else begin with readings that no volume can have.
    """
    balance = rounds.balance
    strength = balance.start_ionic_strength(V[-1:] / 2, chemistry.c)
    ln_gamma = np.repeat(balance.ln_gamma(strength), _GRID.size)
    found = balance.at(_GRID, chemistry, ln_gamma=ln_gamma)
    can_be = found.per_denominator * balance.system.sign > 0
    volume, grid, steep = found.V[can_be], _GRID[can_be], found.slope[can_be]
    if volume.size < 2:
        return
    if volume[0] > volume[-1]:
        volume, grid, steep = volume[::-1], grid[::-1], steep[::-1]
    guess = np.interp(V, volume, grid)
    # where little volume moves the pH much, the guess is worth little
    weights = trust * np.abs(np.interp(V, volume, steep)).clip(max=0.1 * float(V[-1]))
    total = float(weights.sum())
    if not total > 0:
        return
    middle = float(weights @ guess) / total
    away = guess - middle
    spread = float(weights @ (away * away))
    slope = float(weights @ (away * pH)) / spread if spread > 0 else 0.0
    if not 0.6 < slope < 1.4:
        return
    begun = rounds.values.copy()
    begun[1] = float(weights @ pH) / total - PIVOT_pH + slope * (PIVOT_pH - middle)
    begun[2] = slope
    rounds.values = begun


def _plausible(values: Floats, V: Floats) -> None:
    effective, slope = float(values[0]), float(values[2])
    if not np.all(np.isfinite(values)) or effective < float(V[0]) or not 0.7 < slope < 1.3:
        says = "The fit ends outside what a titration can be: not a curve of this system."
        raise FitProblem(says)
    if effective > float(V[-1]):
        says = "The points end before the equivalence point that the fit looks for."
        raise FitProblem(says)
