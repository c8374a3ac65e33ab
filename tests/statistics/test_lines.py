"""Weighted lines against certified values and a second program."""

import json
from pathlib import Path

import numpy as np
import pytest

from server.statistics.lines import LineProblem, weighted_line

NIST = json.loads(
    (Path(__file__).parents[1] / "reference" / "statistics" / "nist.json").read_text()
)


def digits(found, certified):
    """How many significant digits agree."""
    return -np.log10(abs(found - certified) / abs(certified) + 1e-16)


def test_line_norris_agrees_with_the_certified_values():
    # NIST StRD, linear regression, Norris
    set_ = NIST["Norris"]
    y, x = zip(*set_["data_yx"], strict=True)
    line = weighted_line(x, y)
    for found, certified in (
        (line.intercept, set_["B0"]),
        (line.slope, set_["B1"]),
        (line.u_intercept, set_["sB0"]),
        (line.u_slope, set_["sB1"]),
        (line.s, set_["s"]),
        (line.r2, set_["R2"]),
    ):
        assert digits(found, certified) > 11
    assert line.dof == 34


def test_line_with_weights_agrees_with_statsmodels():
    import statsmodels.api as sm

    rng = np.random.default_rng(3)
    x = rng.uniform(0, 100, 25)
    s = 0.1 + 0.02 * x
    y = 3 + 0.5 * x + rng.normal(0, s)
    weights = 1 / s**2
    other = sm.WLS(y, sm.add_constant(x), weights=weights).fit()
    line = weighted_line(x.tolist(), y.tolist(), weights.tolist())
    assert (line.intercept, line.slope) == pytest.approx(tuple(other.params), rel=1e-10)
    assert (line.u_intercept, line.u_slope) == pytest.approx(tuple(other.bse), rel=1e-10)
    there = other.get_prediction(np.array([[1.0, 40.0]]))
    assert line.at(40.0) == pytest.approx(float(there.predicted_mean[0]), rel=1e-10)
    assert line.u_at(40.0) == pytest.approx(float(there.se_mean[0]), rel=1e-10)
    assert line.u_new(40.0, weight=4.0) == pytest.approx(
        float(np.sqrt(there.var_pred_mean[0] + line.s**2 / 4)), rel=1e-10
    )


def test_line_with_known_weights_takes_u_from_the_weights_alone():
    x, y, u = [0.0, 1.0, 2.0, 3.0], [1.0, 1.9, 3.2, 3.9], [0.1, 0.1, 0.2, 0.2]
    weights = [1 / one**2 for one in u]
    known = weighted_line(x, y, weights, known=True)
    design = np.vander(x, 2, increasing=True)
    covariance = np.linalg.inv(design.T @ np.diag(weights) @ design)
    assert (known.u_intercept, known.u_slope) == pytest.approx(np.sqrt(np.diag(covariance)))


def test_line_crossing_has_the_u_that_repeats_show():
    rng = np.random.default_rng(11)
    x = np.linspace(0, 10, 12)
    found = [
        weighted_line(x.tolist(), (2 * x - 15 + rng.normal(0, 0.3, 12)).tolist()).crossing()
        for _ in range(2000)
    ]
    values, u = np.array(found).T
    assert values.mean() == pytest.approx(7.5, abs=0.01)
    assert np.median(u) == pytest.approx(values.std(), rel=0.08)


@pytest.mark.parametrize(
    ("x", "y", "weights", "says"),
    [
        ([1.0, 2.0], [1.0, 2.0], None, "at least 3"),
        ([1.0, 1.0, 1.0], [1.0, 2.0, 3.0], None, "All x are the same"),
        ([1.0, 2.0, 3.0], [1.0, 2.0], None, "equally many"),
        ([1.0, 2.0, 3.0], [1.0, 2.0, 3.0], [1.0, 0.0, 1.0], "above zero"),
    ],
)
def test_line_that_cannot_be_laid_is_refused(x, y, weights, says):
    with pytest.raises(LineProblem, match=says):
        weighted_line(x, y, weights)


def test_line_that_is_level_has_no_crossing():
    with pytest.raises(LineProblem, match="level"):
        weighted_line([0.0, 1.0, 2.0], [1.0, 1.0, 1.0]).crossing()
