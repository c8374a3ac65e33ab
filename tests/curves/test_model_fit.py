"""The model fit: known curves, a second fitter, scatter, and interval estimates that hold."""

import json
from pathlib import Path

import numpy as np
import pytest

from server.curves.circumstances import Circumstances
from server.curves.entrance import analysed
from server.curves.model.charge_balance import ChargeBalance, Flask
from server.curves.model.fit import FitProblem, fit_model
from server.curves.model.scatter import Given, Priors
from server.curves.model.systems import SYSTEMS
from server.curves.model.uncertainty import end_point_uncertainty
from server.curves.points import Points

CURVES = json.loads(
    (Path(__file__).parents[1] / "reference" / "curves" / "simulated.json").read_text()
)["curves"]
SYSTEM = {"tris-hcl": "tris-hcl", "carbonate-hcl-two-steps": "carbonate-hcl"}


def analysis(name, **more):
    set_ = CURVES[name]
    known = Circumstances(
        system=SYSTEMS[SYSTEM.get(name, "khp-naoh")],
        flask_volume_mL=set_["V0_mL"],
        amount_mmol=set_.get("n_acid_mmol") or set_["n_base_mmol"],
        **more,
    )
    seconds = more.get("seconds")
    points = Points(set_["kind"], tuple(set_["V"]), tuple(set_["y"]), seconds)
    return analysed(points, known)


@pytest.mark.parametrize(
    ("name", "within_percent"),
    [
        ("khp-manual-burette", 0.03),
        ("khp-carbonate-in-titrant", 0.03),
        ("tris-hcl", 0.03),
        ("khp-drop-counter", 0.06),
        ("khp-probe-96pct-slope-offset", 0.06),
        ("khp-spikes", 0.06),
        ("carbonate-hcl-two-steps", 0.06),
        ("khp-sparse-14-points", 0.15),
    ],
)
def test_fit_of_a_known_curve_finds_the_equivalence(name, within_percent):
    set_, found = CURVES[name], analysis(name)
    assert found.proposed == "model fit"
    answer = found.outcome("model fit")
    off = answer.volume_mL - set_["equivalence_mL"]
    assert abs(off) / set_["equivalence_mL"] * 100 < within_percent
    assert abs(off) < 2.5 * answer.u_mL
    concentration = found.to_document()["fit"]["effective_mol_L"]
    assert concentration == pytest.approx(set_.get("c", concentration), rel=1.5e-3)


def test_fit_finds_slope_and_offset_of_the_probe():
    set_ = CURVES["khp-probe-96pct-slope-offset"]
    document = analysis("khp-probe-96pct-slope-offset").to_document()["fit"]
    assert document["probe_slope"] == pytest.approx(set_["slope"], abs=0.006)
    assert document["probe_offset"] == pytest.approx(set_["offset"], abs=0.03)


@pytest.mark.parametrize("name", [n for n in CURVES if n.startswith("khp") and "lag" not in n])
def test_fit_finds_the_carbonate_in_the_titrant(name):
    document = analysis(name).to_document()["fit"]
    assert document["carbonate_mol_L"] == pytest.approx(
        CURVES[name].get("carbonate", 0.0), abs=4e-4
    )


def test_fit_reports_the_bubbles_it_gave_no_weight():
    set_ = CURVES["khp-spikes"]
    found = analysis("khp-spikes")
    model = found.fitted.fit
    away = found.to_document()["fit"]["down_weighted"]
    assert len(away) == 4
    curve = np.array(set_["y"]) - model.off_pH
    for at in away:
        neighbours = np.interp(set_["V"][at], np.delete(set_["V"], away), np.delete(curve, away))
        assert abs(set_["y"][at] - neighbours) > 1.0


def second_fit(truth, V, y):
    """The same least squares by scipy: latent pH and parameters together, the tests' own pH(V)."""
    from scipy.optimize import least_squares

    def left(values):
        effective, offset, slope, shift, f = values
        c = truth.n / (effective * (1 - f))
        other = type(truth)(truth.system, truth.V0, truth.n, c, f=f, pK_shift=shift)
        read = 7 + offset + slope * (other.pH(V) - 7)
        priors = np.array([offset / 0.3, (slope - 1) / 0.05, shift / 0.0301, f / 0.02])
        return np.concatenate([(y - read) / 0.01, priors])

    start = [truth.effective_mL + 0.02, 0.0, 1.0, 0.0, 0.001]
    return least_squares(left, start, x_scale=[1e-2, 1e-2, 1e-2, 1e-2, 1e-3]).x


@pytest.mark.slow
def test_fit_agrees_with_scipy_on_the_tests_own_curve(titration, volumes_by_hand):
    truth = titration("khp-naoh", 50.0, 2.0, 0.1, f=0.006)
    V = volumes_by_hand(truth.effective_mL)
    y = 7.05 + 0.985 * (truth.pH(V) - 7) + np.random.default_rng(9).normal(0, 0.01, V.size)
    balance = ChargeBalance(SYSTEMS["khp-naoh"], Flask(truth.V0, truth.n))
    given = Given(priors=Priors(u_flask_carbonate=1e-9), reading_u=0.01, volume_u=1e-6)
    mine = fit_model(balance, V, y, start_mL=truth.effective_mL + 0.02, given=given)
    other = second_fit(truth, V, y)
    # the second way moves all pK together, so pK1 with it; constants typed to three or four figures
    assert mine.effective_mL == pytest.approx(other[0], abs=1e-4)
    assert mine.value("offset") == pytest.approx(other[1], abs=2e-3)
    assert mine.value("slope") == pytest.approx(other[2], abs=5e-4)
    assert mine.value("carbonate") == pytest.approx(other[4], abs=2e-4)


def noisy_fits(truth, volumes, *, count, noise=0.01, seed=7, given=None):
    """Errors and u of the fit's part over noisy repeats of one titration."""
    rng = np.random.default_rng(seed)
    balance = ChargeBalance(SYSTEMS[truth.system], Flask(truth.V0, truth.n))
    off, u = [], []
    for _ in range(count):
        V = volumes(truth.effective_mL, rng)
        y = truth.pH(V) + rng.normal(0, noise, V.size)
        fit = fit_model(balance, V, y, start_mL=truth.effective_mL + 0.02, given=given)
        off.append(fit.effective_mL - truth.effective_mL)
        u.append(end_point_uncertainty(fit).fit_mL)
    return np.array(off), np.array(u)


@pytest.mark.slow
@pytest.mark.parametrize("name", list(SYSTEMS))
def test_fit_interval_holds_over_noisy_repeats(name, usual, volumes_by_hand):
    # the model's part of u is left out: only the scatter of the points differs between repeats
    off, u = noisy_fits(usual[name], volumes_by_hand, count=600)
    covered = np.mean(np.abs(off) <= 2 * u)
    assert 0.93 <= covered <= 0.98
    assert 0.8 <= u.mean() / off.std() <= 1.25
    assert abs(off.mean()) < 0.2 * np.sqrt(np.mean(off**2))


@pytest.mark.slow
def test_fit_interval_holds_where_volumes_scatter_and_it_is_known(usual, volumes_by_hand):
    truth = usual["khp-naoh"]
    rng = np.random.default_rng(12)
    balance = ChargeBalance(SYSTEMS[truth.system], Flask(truth.V0, truth.n))
    off, u = [], []
    for _ in range(200):
        V = volumes_by_hand(truth.effective_mL, rng)
        real = np.maximum(V + rng.normal(0, 0.005, V.size), 0)
        y = truth.pH(real) + rng.normal(0, 0.01, V.size)
        fit = fit_model(balance, V, y, start_mL=truth.effective_mL, given=Given(volume_u=0.005))
        off.append(fit.effective_mL - truth.effective_mL)
        u.append(end_point_uncertainty(fit).fit_mL)
    assert 0.93 <= np.mean(np.abs(off) <= 2 * np.array(u)) <= 0.99
    assert 0.8 <= np.mean(u) / np.std(off) <= 1.25


def test_fit_learns_the_scatter_of_the_readings(usual, volumes_by_hand):
    truth = usual["tris-hcl"]
    V = volumes_by_hand(truth.effective_mL)
    balance = ChargeBalance(SYSTEMS["tris-hcl"], Flask(truth.V0, truth.n))
    for noise in (0.004, 0.03):
        y = truth.pH(V) + np.random.default_rng(3).normal(0, noise, V.size)
        fit = fit_model(balance, V, y, start_mL=truth.effective_mL)
        assert fit.reading_u == pytest.approx(noise, rel=0.3)


@pytest.mark.parametrize("temperature_C", [15.0, 30.0])
def test_fit_at_another_temperature_needs_its_constants(temperature_C, usual, volumes_by_hand):
    # the curve is one of 25 Cel: constants of another temperature show in pK or probe
    truth = usual["tris-hcl"]
    V = volumes_by_hand(truth.effective_mL)
    y = truth.pH(V) + np.random.default_rng(1).normal(0, 0.01, V.size)
    balance = ChargeBalance(SYSTEMS["tris-hcl"], Flask(truth.V0, truth.n, temperature_C))
    fit = fit_model(balance, V, y, start_mL=truth.effective_mL)
    assert fit.effective_mL == pytest.approx(truth.effective_mL, rel=5e-4)
    assert abs(fit.value("pK1") - balance.pK[0]) > 0.03 or abs(fit.value("offset")) > 0.05


def test_fit_start_far_away_comes_to_the_same_place(usual, volumes_by_hand):
    truth = usual["khp-naoh"]
    V = volumes_by_hand(truth.effective_mL)
    y = truth.pH(V) + np.random.default_rng(1).normal(0, 0.01, V.size)
    balance = ChargeBalance(SYSTEMS["khp-naoh"], Flask(truth.V0, truth.n))
    near = fit_model(balance, V, y, start_mL=truth.effective_mL).effective_mL
    for start in (18.5, 19.5, 21.0, 22.0):
        assert fit_model(balance, V, y, start_mL=start).effective_mL == pytest.approx(
            near, abs=2e-5
        )


def test_fit_of_points_that_are_no_curve_of_the_system_is_refused():
    V = np.linspace(0, 20, 40)
    y = 3 + 0.4 * V + np.random.default_rng(1).normal(0, 0.5, V.size)
    balance = ChargeBalance(SYSTEMS["khp-naoh"], Flask(50.0, 2.0))
    with pytest.raises(FitProblem):
        fit_model(balance, V, y, start_mL=10.0)


def test_fit_u_has_the_parts_of_the_model():
    uncertainty = analysis("khp-manual-burette").fitted.uncertainty
    parts = dict(uncertainty.parts)
    # 0.35 µmol of carbonate that the water may hold, over 0.0956 mol/L: 3.7 µL
    assert parts["prior of carbonate in the flask's water"] == pytest.approx(0.00366, rel=0.02)
    assert uncertainty.model_mL == pytest.approx(sum(p * p for p in parts.values()) ** 0.5)
    assert uncertainty.u_mL == pytest.approx(
        float(np.hypot(uncertainty.fit_mL, uncertainty.model_mL))
    )
    for name in ("flask volume", "pKw and temperature", "activity model", "weights"):
        assert parts[name] >= 0


def test_fit_carbonate_known_in_the_water_moves_the_end_point_by_it(titration, volumes_by_hand):
    # 0.7 µmol in 50 mL of air-saturated water, 0.1 mol/L: 7 µL
    truth = titration("khp-naoh", 50.0, 2.0, 0.1, n0=7e-4)
    V = volumes_by_hand(truth.effective_mL)
    y = truth.pH(V) + np.random.default_rng(5).normal(0, 0.005, V.size)
    points = Points("pH", tuple(V), tuple(y))
    known = Circumstances(
        system=SYSTEMS["khp-naoh"],
        flask_volume_mL=truth.V0,
        amount_mmol=truth.n,
        flask_carbonate_mmol=7e-4,
        u_flask_carbonate_mmol=5e-5,
    )
    blind = Circumstances(
        system=SYSTEMS["khp-naoh"],
        flask_volume_mL=truth.V0,
        amount_mmol=truth.n,
        u_flask_carbonate_mmol=1e-6,
    )
    told, untold = (analysed(points, one).outcome("model fit") for one in (known, blind))
    assert told.volume_mL == pytest.approx(truth.effective_mL, abs=1.5e-3)
    assert untold.volume_mL - told.volume_mL == pytest.approx(0.007, abs=1e-3)
