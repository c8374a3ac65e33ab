"""Tests on groups against certified values, scipy and statsmodels."""

import json
from pathlib import Path

import numpy as np
import pytest

from server.statistics.groups import (
    GroupProblem,
    brown_forsythe,
    holm_adjusted,
    one_way_anova,
    paired_difference,
    paired_spread,
    t_test,
    two_one_sided,
    variance_ratio,
    welch_anova,
    welch_difference,
)

NIST = json.loads(
    (Path(__file__).parents[1] / "reference" / "statistics" / "nist.json").read_text()
)
RNG = np.random.default_rng(5)
GROUPS = [RNG.normal(m, s, n).tolist() for m, s, n in ((10, 1, 5), (11, 2, 8), (10.5, 0.5, 4))]


def made(n, mean, s):
    """An odd number of values with exactly this mean and standard deviation."""
    return [mean] + [mean + s, mean - s] * ((n - 1) // 2)


def test_anova_atmwtag_agrees_with_the_certified_values():
    # NIST StRD, analysis of variance, AtmWtAg (average difficulty: 7 constant leading digits)
    set_ = NIST["AtmWtAg"]
    groups = {}
    for group, value in set_["data_group_value"]:
        groups.setdefault(group, []).append(value)
    found = one_way_anova(list(groups.values()))
    assert found.dof == (1.0, 46.0)
    assert found.statistic == pytest.approx(set_["F"], rel=1e-8)


def test_anova_handbook_example_agrees_as_printed():
    # NIST/SEMATECH e-Handbook 7.4.3.3
    found = one_way_anova(NIST["one_way"]["groups"])
    assert round(found.statistic, 2) == NIST["one_way"]["F"]
    assert round(found.p, 5) == NIST["one_way"]["p"]


def test_welch_t_handbook_example_agrees_as_printed():
    # NIST/SEMATECH e-Handbook 1.3.5.3, from the printed n, means and standard deviations
    set_ = NIST["two_sample"]
    first, second = (
        made(n, mean, s) for n, mean, s in zip(set_["n"], set_["mean"], set_["s"], strict=True)
    )
    difference = welch_difference(first, second)
    assert difference.value / difference.u == pytest.approx(set_["welch_t"], abs=2e-5)
    assert difference.dof == pytest.approx(set_["welch_df"], abs=1e-3)


def test_welch_t_agrees_with_scipy():
    from scipy import stats

    difference = welch_difference(GROUPS[0], GROUPS[1])
    other = stats.ttest_ind(GROUPS[0], GROUPS[1], equal_var=False)
    assert t_test(difference).p == pytest.approx(other.pvalue, rel=1e-10)
    assert difference.dof == pytest.approx(other.df, rel=1e-10)


def test_paired_t_agrees_with_scipy():
    from scipy import stats

    first, second = GROUPS[1], [one + 0.1 * at for at, one in enumerate(GROUPS[1])]
    other = stats.ttest_rel(first, second)
    assert t_test(paired_difference(first, second)).p == pytest.approx(other.pvalue, rel=1e-10)


def test_welch_anova_agrees_with_statsmodels():
    from statsmodels.stats.oneway import anova_oneway

    found = welch_anova(GROUPS)
    other = anova_oneway(GROUPS, use_var="unequal", welch_correction=True)
    assert found.statistic == pytest.approx(other.statistic, rel=1e-10)
    assert found.dof == pytest.approx((other.df_num, other.df_denom), rel=1e-10)
    assert found.p == pytest.approx(other.pvalue, rel=1e-9)


def test_brown_forsythe_agrees_with_scipy():
    from scipy import stats

    other = stats.levene(*GROUPS, center="median")
    found = brown_forsythe(GROUPS)
    assert (found.statistic, found.p) == pytest.approx((other.statistic, other.pvalue), rel=1e-10)


def test_variance_ratio_agrees_with_the_f_distribution():
    from scipy import stats

    found = variance_ratio(GROUPS[0], GROUPS[1])
    F = np.var(GROUPS[1], ddof=1) / np.var(GROUPS[0], ddof=1)
    dof = (7, 4) if F > 1 else (4, 7)
    F = max(F, 1 / F)
    assert found.statistic == pytest.approx(F)
    assert found.p == pytest.approx(2 * stats.f.sf(F, *dof))


def test_paired_spread_agrees_with_a_correlation_test():
    from scipy import stats

    first = GROUPS[1]
    second = (np.array(first) + RNG.normal(0, 0.7, len(first))).tolist()
    other = stats.pearsonr(np.add(first, second), np.subtract(first, second))
    assert paired_spread(first, second).p == pytest.approx(other.pvalue, rel=1e-8)


@pytest.mark.parametrize("paired", [False, True])
def test_two_one_sided_agrees_with_statsmodels(paired):
    from statsmodels.stats.weightstats import ttost_ind, ttost_paired

    first = np.array([0.1001, 0.1003, 0.1002, 0.1004])
    second = first + np.array([0.00004, 0.00002, -0.00001, 0.00003])
    if paired:
        p, *_ = ttost_paired(first, second, -0.0001, 0.0001)
        difference = paired_difference(first.tolist(), second.tolist())
    else:
        p, *_ = ttost_ind(first, second, -0.0002, 0.0002, usevar="unequal")
        difference = welch_difference(first.tolist(), second.tolist())
    found = two_one_sided(difference, 0.0001 if paired else 0.0002)
    assert found.p == pytest.approx(p, rel=1e-8)


def test_holm_agrees_with_statsmodels():
    from statsmodels.stats.multitest import multipletests

    p = [0.04, 0.001, 0.2, 0.011, 0.9]
    assert holm_adjusted(p) == pytest.approx(multipletests(p, method="holm")[1])


@pytest.mark.parametrize(
    ("test", "groups", "says"),
    [
        (one_way_anova, [[1.0, 2.0]], "at least two groups"),
        (one_way_anova, [[1.0], [2.0, 3.0]], "at least 2 values"),
        (one_way_anova, [[1.0, 1.0], [2.0, 2.0]], "do not scatter"),
        (welch_anova, [[1.0, 1.0], [2.0, 3.0]], "does not scatter"),
        (brown_forsythe, [[1.0, 2.0], [1.0, 2.0, 3.0]], "at least 3 values"),
    ],
)
def test_groups_that_cannot_be_tested_are_refused_in_words(test, groups, says):
    with pytest.raises(GroupProblem, match=says):
        test(groups)


def test_difference_without_scatter_is_certain_either_way():
    same = welch_difference([1.0, 1.0], [1.0, 1.0])
    apart = welch_difference([1.0, 1.0], [2.0, 2.0])
    assert t_test(same).p == 1.0
    assert t_test(apart).p == 0.0
    assert two_one_sided(apart, 0.5).p == 1.0
    assert two_one_sided(apart, 1.5).p == 0.0
