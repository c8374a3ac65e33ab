import math

import pytest

from server.evaluation.pooled_history import pooled_history


def test_pooled_history_weighs_variances_by_their_degrees_of_freedom():
    # s_p² = Σ(nᵢ − 1)sᵢ²/Σ(nᵢ − 1), JCGM 100, H.5.2.5; here by hand
    spreads = [{"n": 4, "rsd_percent": 0.10}, {"n": 6, "rsd_percent": 0.05}]
    found = pooled_history(spreads)
    assert found.relative_s == pytest.approx(
        math.sqrt((3 * 0.001**2 + 5 * 0.0005**2) / 8), rel=1e-12
    )
    assert found.dof == 8.0
    assert found.source == "2 earlier sheets"


def test_pooled_history_of_single_values_is_none():
    assert pooled_history([]) is None
    assert pooled_history([{"n": 1, "rsd_percent": None}]) is None


def test_pooled_history_of_equal_spreads_is_that_spread():
    found = pooled_history([{"n": n, "rsd_percent": 0.08} for n in (3, 4, 6)])
    assert found.relative_s == pytest.approx(0.0008)
