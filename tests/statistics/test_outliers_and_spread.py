import pytest

from server.statistics.outliers import chi2_limit, critical_grubbs, f_limit, grubbs
from server.statistics.spread import summarize


def test_grubbs_nist_example_finds_the_outlier():
    # NIST/SEMATECH e-Handbook 1.3.5.17.1
    found = grubbs([199.31, 199.53, 200.19, 200.82, 201.92, 201.95, 202.18, 245.57])
    assert found.which == 7
    assert pytest.approx(2.468765, abs=5e-7) == found.G
    assert found.G - found.critical_5 > 0


def test_grubbs_three_values_can_hardly_reach_their_limit():
    # at n = 3 the largest possible G is 2/√3 = 1.1547
    assert critical_grubbs(3, 0.01) == pytest.approx(1.1547, abs=5e-5)
    assert pytest.approx(1.1547, abs=5e-5) == grubbs([1.0, 1.0, 5.0]).G


@pytest.mark.parametrize("values", [[1.0, 2.0], [1.0, 1.0, 1.0]])
def test_grubbs_too_few_or_alike_is_refused(values):
    with pytest.raises(ValueError, match="Grubbs"):
        grubbs(values)


def test_limits_agree_with_scipy_and_the_tables():
    # F(0.95; 4, 10) = 3.478, χ²(0.95; 4) = 9.488: common tables
    from scipy import stats

    assert f_limit(4, 10.0) == pytest.approx(3.478, abs=5e-4)
    assert f_limit(4, 10.0) == pytest.approx(stats.f.ppf(0.95, 4, 10), rel=1e-10)
    assert chi2_limit(4) == pytest.approx(9.488, abs=5e-4)
    assert f_limit(4, None) == pytest.approx(chi2_limit(4) / 4)


def test_summarize_agrees_with_scipy():
    from scipy import stats

    values = [0.10142, 0.10156, 0.10139, 0.10131]
    found = summarize(values)
    low, high = stats.t.interval(0.95, 3, loc=found.mean, scale=stats.sem(values))
    assert found.ci95 == pytest.approx((low, high), rel=1e-9)
    assert found.rsd_percent == pytest.approx(100 * stats.tstd(values) / found.mean, rel=1e-9)


def test_summarize_one_value_has_no_spread():
    found = summarize([0.1])
    assert (found.n, found.s, found.rsd_percent, found.ci95) == (1, None, None, None)
