import math

import numpy as np
import pytest

from server.metrology.monte_carlo import numerical_tolerance, simulate
from server.metrology.propagation import Input


def run(function, inputs, u, value=0.0, t=1.959964, **more):
    given = {"seed": 7, "coverage": 0.95, "trials": 200_000} | more
    return simulate(function, inputs, first_order=(value - t * u, value + t * u), u=u, **given)


def test_simulate_normal_sum_is_validated():
    # JCGM 101, 9.2.2: four standard normal inputs, u = 2.0, interval ±3.92
    inputs = [Input(n, 0.0, 1.0) for n in "abcd"]
    found = run(lambda x: x["a"] + x["b"] + x["c"] + x["d"], inputs, 2.0)
    assert found.first_order_validated
    assert found.u == pytest.approx(2.0, rel=0.01)
    assert (found.low, found.high) == pytest.approx((-3.92, 3.92), abs=0.03)


def test_simulate_rectangular_sum_is_narrower_than_first_order():
    # JCGM 101, 9.2.3: four rectangular inputs of unit variance, interval ±3.88
    inputs = [Input(n, 0.0, 1.0, shape="rectangular", half_width=math.sqrt(3)) for n in "abcd"]
    found = run(lambda x: x["a"] + x["b"] + x["c"] + x["d"], inputs, 2.0, trials=1_000_000)
    assert (found.low, found.high) == pytest.approx((-3.88, 3.88), abs=0.01)


@pytest.mark.parametrize(
    ("shape", "half_width", "kurtosis"),
    [
        ("rectangular", math.sqrt(3), 1.8),
        ("triangular", math.sqrt(6), 2.4),
        ("arcsine", math.sqrt(2), 1.5),
    ],
)
def test_simulate_each_shape_has_its_variance_and_fourth_moment(shape, half_width, kurtosis):
    # moments by integration of the densities of JCGM 101, 6.4
    one = Input("a", 0.0, 1.0, shape=shape, half_width=half_width)
    values = []
    run(lambda x: values.append(x["a"].copy()) or x["a"], [one], 1.0)
    drawn = np.concatenate(values)
    assert drawn.var() == pytest.approx(1.0, rel=0.01)
    assert (drawn**4).mean() == pytest.approx(kurtosis, rel=0.02)
    assert np.abs(drawn).max() <= half_width


def test_simulate_scaled_t_is_wider_and_two_dof_have_no_u():
    # JCGM 101, 6.4.9.4: variance of the scaled t is ν/(ν − 2) times u²
    five = run(lambda x: x["a"], [Input("a", 0.0, 1.0, dof=5)], 1.0, t=2.5706)
    assert five.u == pytest.approx(math.sqrt(5 / 3), rel=0.02)
    assert five.first_order_validated
    assert run(lambda x: x["a"], [Input("a", 0.0, 1.0, dof=2)], 1.0, t=4.3027).u is None


def test_simulate_one_root_moves_together():
    inputs = [Input("a", 1.0, 0.1, id="r"), Input("b", 1.0, 0.1, id="r")]
    found = run(lambda x: x["a"] - x["b"] + 0 * x["a"], inputs, 1e-3)
    assert found.low == found.high == 0.0


def test_simulate_same_seed_gives_the_same_digits_and_raises_trials():
    inputs = [Input("a", 1.0, 0.0099)]
    one, other = (run(lambda x: x["a"], inputs, 0.0099, value=1.0, trials=10_000) for _ in range(2))
    assert one == other
    assert one.trials > 10_000


@pytest.mark.parametrize(
    ("u", "digits", "delta"), [(0.35, 2, 0.005), (0.35, 1, 0.05), (2.0, 2, 0.05)]
)
def test_numerical_tolerance_is_half_a_unit_of_the_last_digit(u, digits, delta):
    # JCGM 101, 7.9.2, examples 1 and 2
    assert numerical_tolerance(u, digits=digits) == pytest.approx(delta)
