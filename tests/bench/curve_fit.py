"""The model fit against lmfit with root finding, and against the Cramér-Rao bound.

    python tests/bench/curve_fit.py [CURVES]

Prints, for 60 and 300 points, with and without activities, carbonate and scatter of the volumes:
the time of both fits on the same curve in the same run and their ratio, and the root-mean-square
error of the effective end point over many noisy curves (default 200) over the Cramér-Rao bound.
The curves come from the tests' own bisection; the bound is reckoned at the true parameters with
the true scatter, the priors counted as observations.
"""

import importlib.util
import sys
import time
from pathlib import Path

import lmfit
import numpy as np
from scipy.optimize import brentq

from server.curves.model.charge_balance import ChargeBalance, Chemistry, Flask
from server.curves.model.fit import fit_model
from server.curves.model.scatter import Given
from server.curves.model.systems import SYSTEMS

HERE = Path(__file__).resolve().parent
_spec = importlib.util.spec_from_file_location("second_way", HERE.parent / "curves" / "conftest.py")
second_way = importlib.util.module_from_spec(_spec)
sys.modules["second_way"] = second_way
_spec.loader.exec_module(second_way)

READING_U = 0.01
CASES = [
    (points, activities, carbonate, volume_u)
    for points in (60, 300)
    for activities in (False, True)
    for carbonate in (False, True)
    for volume_u in (0.0, 0.003)
]


def volumes(points, end_mL, shift):
    """By hand (uneven) for about 60 points, evenly dropped for 300."""
    if points == 60:
        rng = np.random.default_rng(int(1e6 * shift))
        return second_way.manual_volumes(end_mL, rng)
    return np.linspace(0, 1.2 * end_mL, points) + shift * end_mL / points * (np.arange(points) > 0)


def root_finding(V, y, *, flask, start_mL, activities):
    """Fit the same five parameters with lmfit, the pH at each volume found by brentq."""
    K1w, A = 10.0**-13.995, 0.5108

    def found_pH(v, c, pK, f, gamma):
        K1, K2 = 10**-2.95 / gamma, 10.0**-pK / gamma**3
        C1, C2 = 10**-6.352 / gamma, 10**-10.329 / gamma**3
        total, n = flask.volume_mL + v, flask.amount_mmol

        def excess(x):
            a = 10.0**-x
            p1 = K1 / a
            p2 = p1 * K2 / a
            q1 = C1 / a
            q2 = q1 * C2 / a
            water = (a - K1w / a) / gamma
            phthalate = n * (p1 + 2 * p2) / (1 + p1 + p2)
            carbonate = c * f * v * (q1 + 2 * q2) / (1 + q1 + q2)
            return c * v + n + total * water - phthalate - carbonate

        return brentq(excess, 1.0, 13.5, xtol=1e-9)

    def residuals(values):
        c, pK, offset, slope, f = (values[k].value for k in ("c", "pK", "offset", "slope", "f"))
        read = []
        for v in V:
            gamma = 1.0
            if activities:
                ionic = (flask.amount_mmol + c * v) / (flask.volume_mL + v)
                root = ionic**0.5
                gamma = 10 ** (-A * (root / (1 + root) - 0.3 * ionic))
            read.append(7 + offset + slope * (found_pH(v, c, pK, f, gamma) - 7))
        return np.array(read) - y

    values = lmfit.Parameters()
    values.add("c", flask.amount_mmol / start_mL)
    for name, start in (("pK", 5.40), ("offset", 0.0), ("slope", 1.0), ("f", 0.001)):
        values.add(name, start)
    return lmfit.minimize(residuals, values)


def bound(balance, truth, V, volume_u):
    """The Cramér-Rao bound of the effective volume at the truth, in mL."""
    pH = truth.pH(V)
    chemistry = Chemistry(balance.pK, truth.c, truth.f, truth.n0)
    ln_gamma = balance.ln_gamma(balance.start_ionic_strength(V, truth.c))
    for _ in range(5):
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
    weights = 1 / (np.square(found.slope * READING_U) + volume_u**2)
    # the truth lies at the priors' centre, so only the points' scatter counts
    priors = np.array([0, 0.3, 0.05, 0.0301, 0.02, 3.5e-4])
    precision = np.diag(np.where(priors > 0, 1 / np.maximum(priors, 1e-12) ** 2, 0))
    information = (rows * weights) @ rows.T
    covariance = np.linalg.inv(information + precision)
    return float((covariance @ information @ covariance)[0, 0]) ** 0.5


def case(points, activities, carbonate, volume_u, *, curves):
    """One line of the table."""
    truth = second_way.Titration(
        "khp-naoh", 50.0, 2.0, 0.1, f=0.012 if carbonate else 0.0, activities=activities
    )
    flask = Flask(truth.V0, truth.n, 25.0)
    balance = ChargeBalance(SYSTEMS["khp-naoh"], flask, activities=activities)
    rng = np.random.default_rng(20240607)
    made = []
    for _ in range(curves):
        V = volumes(points, truth.effective_mL, float(rng.uniform()))
        real = np.maximum(V + rng.normal(0, volume_u, V.size), 0)
        made.append((V, truth.pH(real) + rng.normal(0, READING_U, V.size)))
    answers = {}
    for name, given in (
        ("known", Given(reading_u=READING_U, volume_u=max(volume_u, 2e-6))),
        ("learnt", Given()),
    ):
        errors = (
            np.array(
                [
                    fit_model(
                        balance, V, y, start_mL=truth.effective_mL + 0.03, given=given
                    ).effective_mL
                    for V, y in made
                ]
            )
            - truth.effective_mL
        )
        answers[name] = errors
    least = np.mean([bound(balance, truth, V, volume_u) ** 2 for V, _ in made]) ** 0.5
    V, y = made[0]
    ours, theirs = [], []
    for _ in range(3):
        began = time.perf_counter()
        root_finding(V, y, flask=flask, start_mL=truth.effective_mL + 0.03, activities=activities)
        theirs.append(time.perf_counter() - began)
        for _ in range(30):
            began = time.perf_counter()
            fit_model(balance, V, y, start_mL=truth.effective_mL + 0.03)
            ours.append(time.perf_counter() - began)
    mine, other = float(np.median(ours)), float(np.median(theirs))
    words = [
        f"{V.size:4d} points",
        "Davies" if activities else "ideal ",
        f"carbonate {100 * truth.f:.1f} %",
        f"s_V {1000 * volume_u:.0f} µL",
        f"fit {1000 * mine:6.2f} ms, lmfit {1000 * other:7.1f} ms, 1/{other / mine:4.0f}",
    ]
    for name, errors in answers.items():
        rms = float(np.sqrt(np.mean(errors**2)))
        words.append(
            f"scatter {name}: rms {1000 * rms:.3f} µL = {rms / least:.2f} bound, "
            f"bias {float(errors.mean()) / rms:+.2f} rms"
        )
    print(" | ".join(words), flush=True)


def main():
    curves = int(sys.argv[1]) if len(sys.argv) > 1 else 200
    for points, activities, carbonate, volume_u in CASES:
        case(points, activities, carbonate, volume_u, curves=curves)


if __name__ == "__main__":
    main()
