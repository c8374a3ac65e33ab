"""Bubbles are found, jumps are not taken for bubbles."""

import numpy as np
import pytest

from server.curves.bubbles import scatter_of, thrown_off


@pytest.fixture
def curve(usual, volumes_by_hand):
    truth = usual["khp-naoh"]
    V = volumes_by_hand(truth.effective_mL)
    return V, truth.pH(V)


def test_bubbles_curve_without_any_gives_none_even_at_the_jump(curve):
    V, pH = curve
    rng = np.random.default_rng(2)
    for _ in range(50):
        assert thrown_off(V, pH + rng.normal(0, 0.02, V.size), kind="pH") == []


def test_bubbles_of_either_sign_are_found_where_they_are(curve):
    V, pH = curve
    rng = np.random.default_rng(4)
    y = pH + rng.normal(0, 0.01, V.size)
    for at, off in ((5, 1.5), (12, -1.2), (27, 1.5), (50, -1.5)):
        y[at] += off
    assert thrown_off(V, y, kind="pH") == [5, 12, 27, 50]


def test_bubbles_two_in_a_row_are_both_found(curve):
    V, pH = curve
    y = pH + np.random.default_rng(5).normal(0, 0.01, V.size)
    y[8:10] += 1.0
    assert thrown_off(V, y, kind="pH") == [8, 9]


def test_bubbles_in_mV_are_judged_in_mV(curve):
    V, pH = curve
    y = 59.16 * pH + np.random.default_rng(6).normal(0, 0.5, V.size)
    y[10] += 80
    assert thrown_off(V, y, kind="mV") == [10]


@pytest.mark.parametrize("noise", [0.005, 0.02])
def test_scatter_is_that_of_the_readings(noise):
    V = np.linspace(0, 10, 400)
    y = 4 + 0.3 * V + np.random.default_rng(8).normal(0, noise, V.size)
    assert scatter_of(V, y) == pytest.approx(noise, rel=0.15)
