"""Derivative end points: printed columns, known curves, uneven spacing, honest u."""

import json
from pathlib import Path

import numpy as np
import pytest

from server.curves.derivatives import (
    difference_columns,
    first_derivative,
    second_derivative,
    steepest_segment,
)
from server.curves.jumps import cleaned, jumps
from server.curves.outcome import CannotTell
from server.curves.points import Points, titration_curve

# D. Harvey, Modern Analytical Chemistry (2000), table 9.5
HARVEY = json.loads(
    (Path(__file__).parents[1] / "reference" / "curves" / "published.json").read_text()
)["curves"][0]


def clean_curve(V, y, kind="pH"):
    return cleaned(titration_curve(Points(kind, tuple(V), tuple(y))))


def printed(value):
    """A printed number and half a unit of its last digit."""
    text = repr(value)
    return value, 0.5 * 10.0 ** -len(text.partition(".")[2])


def test_difference_columns_are_those_printed():
    V, y = np.array(HARVEY["x_volume_mL"]), np.array(HARVEY["y"])
    middle, first, between, second = difference_columns(V, y)
    assert len(HARVEY["published_first_derivative"]) == first.size
    assert len(HARVEY["published_second_derivative"]) == second.size
    for (place, value), m, f in zip(
        HARVEY["published_first_derivative"], middle, first, strict=True
    ):
        # a printed digit, and a trifle for its own rounding half up
        assert m == pytest.approx(place, abs=1e-9)
        assert f == pytest.approx(value, abs=printed(value)[1] * 1.02)
    for (place, value), b, s in zip(
        HARVEY["published_second_derivative"], between, second, strict=True
    ):
        # the book rounds the places to two decimals before it divides: up to 0.5 % of the value
        assert b == pytest.approx(place, abs=0.0051)
        assert s == pytest.approx(value, abs=max(printed(value)[1] * 1.02, 0.005 * abs(value)))


def test_second_derivative_of_the_printed_curve_crosses_where_its_signs_change():
    clean = clean_curve(HARVEY["x_volume_mL"], HARVEY["y"])
    jump = jumps(clean)[-1]
    found = second_derivative(clean, jump)
    # sign change printed between 15.60 and 15.70; 15.6686 by interpolation of the printed columns
    assert found.volume_mL == pytest.approx(15.668571, abs=1e-4)
    assert clean.middle(jump) == pytest.approx(15.65)


@pytest.mark.parametrize("method", [first_derivative, second_derivative, steepest_segment])
@pytest.mark.parametrize("turned", [1, -1])
def test_derivatives_find_the_middle_of_a_symmetric_jump(method, turned):
    # volume as a sinh of the reading: the inflection lies exactly at 10 mL
    V = 10 + np.array([-6, -4, -2, -1, -0.4, -0.13, -0.07, -0.01, 0.05, 0.11, 0.2, 0.9, 2, 4, 6])
    y = turned * np.arcsinh((V - 10) / 0.02)
    clean = clean_curve(V, y, "mV")
    found = method(clean, jumps(clean)[-1])
    assert found.volume_mL == pytest.approx(10, abs=0.03)
    assert abs(found.volume_mL - 10) < 2.5 * found.u_mL


def test_derivatives_do_not_depend_on_the_unit_of_the_reading(usual, volumes_by_hand):
    truth = usual["tris-hcl"]
    V = volumes_by_hand(truth.effective_mL)
    pH = truth.pH(V) + np.random.default_rng(1).normal(0, 0.01, V.size)
    one, other = clean_curve(V, pH), clean_curve(V, -59.16 * pH, "mV")
    for method in (first_derivative, second_derivative, steepest_segment):
        a, b = method(one, jumps(one)[-1]), method(other, jumps(other)[-1])
        assert a.volume_mL == pytest.approx(b.volume_mL, abs=1e-9)
        assert a.u_mL == pytest.approx(b.u_mL, rel=1e-6)


def test_second_derivative_is_smoothed_where_the_scatter_drowns_it(usual):
    truth = usual["carbonate-hcl"]
    V = np.concatenate([np.arange(0, 18.4, 0.4), np.arange(18.4, 23, 0.05)])
    y = truth.pH(V) + np.random.default_rng(2).normal(0, 0.01, V.size)
    clean = clean_curve(V, y)
    found = second_derivative(clean, jumps(clean)[-1])
    assert "Smoothed over" in found.says
    assert abs(found.volume_mL - truth.effective_mL) < 2.5 * found.u_mL


def test_steepest_segment_says_how_many_steps_may_be_the_steepest(usual):
    truth = usual["carbonate-hcl"]
    V = np.concatenate([np.arange(0, 19.0, 0.5), np.arange(19.0, 23, 0.05)])
    y = truth.pH(V) + np.random.default_rng(3).normal(0, 0.02, V.size)
    clean = clean_curve(V, y)
    found = steepest_segment(clean, jumps(clean)[-1])
    assert "which of" in found.says
    assert found.u_mL > 0.05 / 12**0.5 * 1.5


def test_derivatives_at_the_end_of_the_points_say_that_more_are_needed():
    V = np.arange(0, 8.0)
    y = np.array([4.0, 4.2, 4.4, 4.7, 5.0, 5.4, 6.0, 10.0])
    clean = clean_curve(V, y)
    for method in (first_derivative, second_derivative):
        with pytest.raises(CannotTell, match="more are needed"):
            method(clean, jumps(clean)[-1])
