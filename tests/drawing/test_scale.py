"""Scales: linear, and round values as a person would choose them."""

import pytest

from server.drawing.scale import Scale, round_values, scale_around


def test_scale_at_is_linear_between_its_ends() -> None:
    scale = Scale(low=10, high=20, start=100, end=0)
    assert [scale.at(v) for v in (10, 15, 20)] == [100, 50, 0]


def test_scale_around_equal_values_puts_them_in_the_middle() -> None:
    scale = scale_around([5.0, 5.0], start=0, end=100, least=0.1)
    assert scale.at(5.0) == pytest.approx(50)
    assert scale.high - scale.low == pytest.approx(0.1)


def test_scale_around_leaves_room_at_both_ends() -> None:
    scale = scale_around([0.0, 10.0], start=0, end=124)
    assert scale.at(0.0) == pytest.approx(12)
    assert scale.at(10.0) == pytest.approx(112)


@pytest.mark.parametrize(
    ("low", "high", "expected"),
    [
        (0.0, 10.0, [0, 5, 10]),
        (0.10196, 0.10234, [0.102, 0.1021, 0.1022, 0.1023]),
        (-1.0, 1.0, [-1.0, -0.5, 0.0, 0.5, 1.0]),
    ],
)
def test_round_values_are_multiples_of_one_two_or_five(low, high, expected) -> None:
    assert round_values(low, high) == pytest.approx(expected, abs=1e-12)
