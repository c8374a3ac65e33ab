"""Where a curve jumps, how often, and that noise and steep ends are no jumps."""

import numpy as np
import pytest

from server.curves.jumps import cleaned, jumps, steepest_about
from server.curves.points import Points, titration_curve


def clean_curve(V, y, kind="pH"):
    return cleaned(titration_curve(Points(kind, tuple(V), tuple(y))))


@pytest.mark.parametrize("noise", [0.0, 0.01, 0.03])
@pytest.mark.parametrize("name", ["khp-naoh", "tris-hcl"])
def test_one_jump_is_found_where_it_is(name, noise, usual, volumes_by_hand):
    truth = usual[name]
    V = volumes_by_hand(truth.effective_mL)
    clean = clean_curve(V, truth.pH(V) + np.random.default_rng(1).normal(0, noise, V.size))
    found = jumps(clean)
    assert len(found) == 1
    assert clean.middle(found[0]) == pytest.approx(truth.effective_mL, abs=0.06)


def test_two_jumps_of_carbonate_are_found_in_order(usual):
    truth = usual["carbonate-hcl"]
    V = np.arange(0, 24, 0.2)
    clean = clean_curve(V, truth.pH(V))
    first, second = (clean.middle(at) for at in jumps(clean))
    assert first == pytest.approx(10.0, abs=0.3)
    assert second == pytest.approx(20.0, abs=0.3)


def test_noise_of_a_drop_counter_makes_no_second_jump(usual):
    truth = usual["khp-naoh"]
    V = np.arange(0, 25, 0.05)
    pH = truth.pH(V)
    rng = np.random.default_rng(3)
    for _ in range(40):
        assert len(jumps(clean_curve(V, pH + rng.normal(0, 0.02, V.size)))) == 1


def test_repeated_volume_takes_the_last_reading():
    V = [0.0, 1.0, 2.0, 2.0, 3.0, 4.0, 5.0, 6.0]
    y = [4.0, 4.2, 4.3, 4.4, 4.6, 8.0, 10.0, 10.5]
    clean = clean_curve(V, y)
    assert clean.at == (0, 1, 3, 4, 5, 6, 7)
    assert clean.y[2] == 4.4


def test_steepest_about_a_volume_without_points_is_none(usual):
    V = np.arange(0, 12, 0.5)
    clean = clean_curve(V, usual["carbonate-hcl"].pH(V))
    assert steepest_about(clean, 20.0) is None
    assert steepest_about(clean, 10.0) is not None
