"""What makes a curve, and what is refused with its place."""

import numpy as np
import pytest

from server.curves.points import CurveProblem, Points, titration_curve

V = (0.0, 1.0, 2.0, 3.0, 4.0, 5.0, 6.0)
PH = (4.0, 4.4, 4.8, 5.4, 8.0, 10.5, 11.0)


def test_curve_of_points_knows_its_direction():
    assert titration_curve(Points("pH", V, PH)).direction == "rising"
    falling = titration_curve(Points("mV", V, tuple(-y for y in PH)))
    assert falling.direction == "falling"
    assert np.all(np.diff(falling.rising) > 0)


@pytest.mark.parametrize(
    ("points", "says", "index"),
    [
        (Points("redox", V, PH), "pH or in mV", None),
        (Points("pH", V[:5], PH[:5]), "at least 6 points; here are 5", None),
        (Points("pH", V, PH[:6]), "equally many", None),
        (Points("pH", V, PH, (0.0,) * 3), "equally many", None),
        (Points("pH", (*V[:6], float("nan")), PH), "volume of point 7 is not a number", 6),
        (Points("pH", V, (*PH[:2], float("inf"), *PH[3:])), "reading of point 3", 2),
        (Points("pH", (*V[:4], 1.5, *V[5:]), PH), "goes back at point 5: 1.5 after 3", 4),
        (Points("pH", V, PH, (0.0, 1.0, 2.0, 1.0, 4.0, 5.0, 6.0)), "time goes back", 3),
        (Points("pH", V, (7.0,) * 7), "All readings are the same", None),
        (Points("pH", (0.0, 0.0, 0.0, 1.0, 2.0, 3.0, 4.0), PH), "6 different volumes", None),
    ],
)
def test_points_that_make_no_curve_are_refused_with_their_place(points, says, index):
    with pytest.raises(CurveProblem, match=says) as caught:
        titration_curve(points)
    assert caught.value.index == index
