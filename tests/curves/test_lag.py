"""A slow probe: taken out, looked for, and said."""

import json
from pathlib import Path

import numpy as np
import pytest

from server.curves.circumstances import Circumstances
from server.curves.entrance import analysed
from server.curves.model.lag import lag_model
from server.curves.model.systems import SYSTEMS
from server.curves.points import Points

LAGGING = json.loads(
    (Path(__file__).parents[1] / "reference" / "curves" / "simulated.json").read_text()
)["curves"]["khp-probe-lag"]
SECONDS = tuple(one / 0.05 for one in LAGGING["V"])  # a drop of 0.05 mL a second


def analysis(V, y, seconds=None, *, V0=60.0, n=None):
    known = Circumstances(
        system=SYSTEMS["khp-naoh"],
        flask_volume_mL=V0,
        amount_mmol=n or LAGGING["n_acid_mmol"],
    )
    return analysed(Points("pH", tuple(V), tuple(y), seconds), known)


def finding(found, name):
    return next(one for one in found.findings if one.name == name)


def test_lag_taken_out_is_what_was_put_in():
    rng = np.random.default_rng(1)
    curve = np.cumsum(rng.uniform(0, 0.5, 80))
    seconds = np.cumsum(rng.uniform(0.5, 3.0, 80))
    model = lag_model(curve, seconds, ())
    lagged = model.lagged(0.4, curve)
    assert lag_model(lagged, seconds, ()).freed(0.4) == pytest.approx(curve, abs=1e-9)
    assert lagged[40] < curve[40]


def test_lag_variance_is_that_of_many_repeats():
    rng = np.random.default_rng(2)
    seconds = np.cumsum(rng.uniform(0.5, 3.0, 30))
    model = lag_model(np.zeros(30), seconds, ())
    u = rng.uniform(0.01, 0.1, 30)
    seen = np.array([model.lagged(0.5, rng.normal(0, u)) for _ in range(20000)])
    assert seen.var(axis=0) == pytest.approx(model.lagged_variance(0.5, u**2), rel=0.06)


def test_lag_constant_is_the_time_in_which_a_step_falls_to_a_third():
    model = lag_model(np.zeros(10), np.arange(10.0), ())
    assert model.constant(np.exp(-1 / 1.5)) == pytest.approx(1.5)


def test_lag_with_times_is_fitted_and_taken_out():
    found = analysis(LAGGING["V"], LAGGING["y"], SECONDS)
    document = found.to_document()
    assert document["fit"]["lag_s"] == pytest.approx(1.5, abs=0.2)
    answer = found.outcome("model fit")
    assert answer.volume_mL == pytest.approx(LAGGING["equivalence_mL"], rel=2e-3)
    assert abs(answer.volume_mL - LAGGING["equivalence_mL"]) < 2.5 * answer.u_mL
    assert finding(found, "lag").verdict == "look"


def test_lag_without_times_is_flagged_and_the_fit_is_not_proposed():
    found = analysis(LAGGING["V"], LAGGING["y"])
    said = finding(found, "lag")
    assert said.verdict == "fails"
    assert "about 1.5 readings" in said.says
    assert found.proposed == "first derivative"
    assert found.to_document()["fit"]["lag_s"] is None
    answer = found.outcome("model fit")
    assert abs(answer.volume_mL - LAGGING["equivalence_mL"]) < 2.5 * answer.u_mL


@pytest.mark.parametrize("seconds", [None, SECONDS])
def test_lag_that_was_found_is_in_the_u_of_every_other_method(seconds):
    found = analysis(LAGGING["V"], LAGGING["y"], seconds)
    for one in found.outcomes:
        assert abs(one.volume_mL - LAGGING["equivalence_mL"]) < 2.5 * one.u_mL, one.method
        assert one.method == "model fit" or one.says.endswith("mL for the lag of the probe.")


@pytest.mark.slow
@pytest.mark.parametrize("timed", [False, True])
def test_lag_is_not_seen_where_there_is_none(timed, titration):
    truth = titration("khp-naoh", 60.0, 1.0, 0.1)
    V = np.arange(0, 12, 0.05)
    pH = truth.pH(V)
    rng = np.random.default_rng(6)
    seconds = tuple(V / 0.05) if timed else None
    seen = 0
    for _ in range(60):
        y = pH + rng.normal(0, 0.015, V.size)
        seen += finding(analysis(V, y, seconds, n=1.0), "lag").verdict != "holds"
    assert seen <= 2


@pytest.mark.slow
@pytest.mark.parametrize("constant_s", [0.8, 1.5, 3.0])
def test_lag_of_several_sizes_is_found_with_its_u(constant_s, titration):
    truth = titration("khp-naoh", 60.0, 1.0, 0.1)
    V = np.arange(0, 12, 0.05)
    seconds = V / 0.05
    pH = truth.pH(V)
    model = lag_model(pH, seconds, ())
    lagged = model.lagged(float(np.exp(-1 / constant_s)), pH)
    rng = np.random.default_rng(8)
    constants, off = [], []
    for _ in range(20):
        y = lagged + rng.normal(0, 0.01, V.size)
        found = analysis(V, y, tuple(seconds), n=1.0)
        constants.append(found.to_document()["fit"]["lag_s"])
        off.append(found.outcome("model fit").volume_mL - truth.effective_mL)
    assert None not in constants
    assert np.mean(constants) == pytest.approx(constant_s, rel=0.05)
    assert np.abs(off).max() < 0.002 * truth.effective_mL
