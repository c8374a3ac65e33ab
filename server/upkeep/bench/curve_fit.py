"""The model fit against lmfit with root finding, and its error against the Cramér-Rao bound.

For 60 and 300 points, with and without activities, carbonate and scatter of the volumes: the time
of both fits on the same curves in the same run, and the root-mean-square error of the effective
end point over noisy curves over the bound. The bound is reckoned at the true parameters with the
true scatter, the priors counted as observations.
"""

import time
from collections.abc import Iterator
from dataclasses import dataclass
from importlib import import_module
from itertools import product
from typing import Any

import numpy as np
from numpy.typing import NDArray

from server.curves.model.charge_balance import ChargeBalance, Chemistry, Flask
from server.curves.model.fit import fit_model
from server.curves.model.scatter import Given, Priors
from server.curves.model.systems import SYSTEMS
from server.upkeep.bench.known_curve import (
    AMOUNT_MMOL,
    FLASK_ML,
    KnownCurve,
    fit_by_roots,
    volumes_by_drops,
    volumes_by_hand,
)
from server.upkeep.bench.table import Line

Floats = NDArray[np.float64]
Curve = tuple[Floats, Floats]

#: What is to be reached.
TIMES_FASTER, RMS_OVER_BOUND, BIAS_OVER_RMS = 50.0, 1.15, 0.2
CURVES = 200
_READING_U, _CARBONATE, _VOLUME_U = 0.01, 0.012, 0.003
_EXACT_ML = 2e-6
_AWAY_ML = 0.03
_TIMED_CURVES, _TIMES = 3, 20
_ROUNDS_OF_ACTIVITIES = 6
_SEED = 20240607


@dataclass(frozen=True, slots=True)
class Case:
    """One line of the table: points, and what is in the curves beside the scatter of readings."""

    points: int
    activities: bool
    carbonate: float
    volume_u: float

    def truth(self) -> KnownCurve:
        """Return the titration that the curves are of."""
        return KnownCurve(carbonate=self.carbonate, activities=self.activities)

    def balance(self) -> ChargeBalance:
        """Return the program's charge balance of it."""
        flask = Flask(FLASK_ML, AMOUNT_MMOL, 25.0)
        return ChargeBalance(SYSTEMS["khp-naoh"], flask, activities=self.activities)

    def volumes(self, shift: float) -> Floats:
        """Return volumes shifted by a fraction of a step."""
        by_hand = self.points == 60
        return volumes_by_hand(shift) if by_hand else volumes_by_drops(self.points, shift)


CASES = tuple(
    Case(*one) for one in product((60, 300), (False, True), (0.0, _CARBONATE), (0.0, _VOLUME_U))
)


def lines(*, cases: tuple[Case, ...] = CASES, curves: int = CURVES) -> Iterator[Line]:
    """Yield the table line by line: heads, what is to be reached, and a line for each case."""
    yield Line(
        f"Model fit of {curves} noisy curves, phthalate with sodium hydroxide; to reach: 1/"
        f"{TIMES_FASTER:g} of lmfit's time, RMS error {RMS_OVER_BOUND:g} times the Cramér-Rao "
        f"bound, bias {BIAS_OVER_RMS:g} of RMS."
    )
    lmfit = _lmfit()
    if lmfit is None:
        says = (
            "lmfit is missing, so that there is no yardstick of time: install the development "
            "extra (pip install 'titrant-ledger[dev]')."
        )
        yield Line(says, ("time",))
    for case in cases:
        yield _line(case, curves, lmfit)


def _lmfit() -> Any:
    try:
        return import_module("lmfit")
    except ImportError:
        return None


def _line(case: Case, curves: int, lmfit: Any) -> Line:
    truth, balance = case.truth(), case.balance()
    made = _curves(case, truth, curves)
    least = float(np.sqrt(np.mean([_bound(case, balance, truth, V) ** 2 for V, _ in made])))
    words = [
        f"{made[0][0].size:4d} points",
        "Davies" if case.activities else "ideal ",
        f"carbonate {100 * case.carbonate:.1f} %",
        f"volumes ±{1000 * case.volume_u:.0f} µL",
    ]
    missed: list[str] = []
    if lmfit is not None:
        ours, theirs = _times(case, balance, made[:_TIMED_CURVES], lmfit)
        words.append(f"fit {ours:6.3f} ms, lmfit {theirs:7.1f} ms = 1/{theirs / ours:.0f}")
        missed += ["time"] if theirs / ours < TIMES_FASTER else []
    known = Given(priors=Priors(), reading_u=_READING_U, volume_u=max(case.volume_u, _EXACT_ML))
    for name, given in (("scatter given", known), ("scatter learnt", None)):
        off = np.array([_off(balance, truth, curve, given) for curve in made])
        rms, bias = float(np.sqrt(np.mean(off**2))), float(off.mean())
        words.append(
            f"{name}: RMS {1000 * rms:.3f} µL over bound {1000 * least:.3f} µL = "
            f"{rms / least:.2f}, bias {bias / rms:+.2f}"
        )
        missed += [f"RMS, {name}"] if rms > RMS_OVER_BOUND * least else []
        missed += [f"bias, {name}"] if abs(bias) > BIAS_OVER_RMS * rms else []
    return Line(" | ".join(words), tuple(missed))


def _curves(case: Case, truth: KnownCurve, curves: int) -> list[Curve]:
    rng = np.random.default_rng(_SEED)
    made = []
    for _ in range(curves):
        V = case.volumes(float(rng.uniform()))
        real = np.maximum(V + rng.normal(0, case.volume_u, V.size), 0)
        made.append((V, truth.pH(real) + rng.normal(0, _READING_U, V.size)))
    return made


def _off(balance: ChargeBalance, truth: KnownCurve, curve: Curve, given: Given | None) -> float:
    V, y = curve
    fit = fit_model(balance, V, y, start_mL=truth.effective_mL + _AWAY_ML, given=given)
    return fit.effective_mL - truth.effective_mL


def _times(
    case: Case, balance: ChargeBalance, made: list[Curve], lmfit: Any
) -> tuple[float, float]:
    """Return the median times of both fits in ms."""
    start = case.truth().effective_mL + _AWAY_ML
    ours, theirs = [], []
    for V, y in made:
        began = time.perf_counter()
        fit_by_roots(V, y, start_mL=start, activities=case.activities, lmfit=lmfit)
        theirs.append(time.perf_counter() - began)
        for _ in range(_TIMES):
            began = time.perf_counter()
            fit_model(balance, V, y, start_mL=start)
            ours.append(time.perf_counter() - began)
    return 1000 * float(np.median(ours)), 1000 * float(np.median(theirs))


def _bound(case: Case, balance: ChargeBalance, truth: KnownCurve, V: Floats) -> float:
    """Return the Cramér-Rao bound of the effective volume at the truth, in mL."""
    pH = truth.pH(V)
    chemistry = Chemistry(balance.pK, truth.mol_per_L, truth.carbonate, 0.0)
    ln_gamma = balance.ln_gamma(balance.start_ionic_strength(V, truth.mol_per_L))
    for _ in range(_ROUNDS_OF_ACTIVITIES):
        found = balance.at(pH, chemistry, ln_gamma=ln_gamma)
        ln_gamma = balance.ln_gamma(balance.ionic_strength(found, chemistry, V))
    found = balance.at(pH, chemistry, ln_gamma=ln_gamma)
    rows = np.array(
        [
            balance.per_effective(found, truth.effective_mL),
            -found.slope,
            found.slope * (7 - pH),
            balance.per_pK(found, 1),
            balance.per_carbonate(found, chemistry),
            balance.per_flask_carbonate(found),
        ]
    )
    weights = 1 / (np.square(found.slope * _READING_U) + case.volume_u**2)
    # the truth lies at the priors' centre, so that only the points' scatter counts
    priors = Priors()
    system = balance.system
    widths = np.array(
        [
            np.inf,
            priors.offset,
            priors.slope,
            np.hypot(system.u_pK, system.analyte[1].u),
            priors.carbonate,
            priors.u_flask_carbonate,
        ]
    )
    information = (rows * weights) @ rows.T
    covariance = np.linalg.inv(information + np.diag(1 / widths**2))
    return float(np.sqrt((covariance @ information @ covariance)[0, 0]))
