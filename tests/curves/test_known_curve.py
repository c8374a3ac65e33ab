"""The curves of the measurements, against the tests' own bisection: two ways that share nothing."""

import numpy as np
import pytest

from server.upkeep.bench.known_curve import KnownCurve


@pytest.mark.parametrize("activities", [True, False])
def test_known_curve_agrees_with_the_tests_own_bisection(activities, titration) -> None:
    truth = titration("khp-naoh", 50.0, 2.0, 0.1, f=0.012, activities=activities)
    V = np.array([0.0, 2.0, 10.0, 19.0, 20.0, 20.4, 22.0, 25.0])
    mine = KnownCurve(carbonate=0.012, activities=activities)
    # both type pK2 to four or five figures
    assert mine.pH(V) == pytest.approx(truth.pH(V), abs=1e-3)
    assert mine.effective_mL == truth.effective_mL
