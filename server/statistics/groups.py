"""Tests on groups of values: means, spreads, and equality within a margin."""

from collections.abc import Sequence
from dataclasses import dataclass
from math import fsum, inf, sqrt


class GroupProblem(ValueError):
    """Groups that a test cannot be made on; the words say why."""


@dataclass(frozen=True, slots=True)
class TestResult:
    """A test's statistic, its degrees of freedom and its p-value."""

    __test__ = False

    name: str
    statistic: float
    dof: tuple[float, ...]
    p: float


@dataclass(frozen=True, slots=True)
class Difference:
    """A difference of two means with its standard uncertainty and degrees of freedom."""

    value: float
    u: float
    dof: float


Groups = Sequence[Sequence[float]]


def mean_of(values: Sequence[float]) -> float:
    """Return the mean."""
    return fsum(values) / len(values)


def variance_of(values: Sequence[float]) -> float:
    """Return the experimental variance, n - 1 below."""
    middle = mean_of(values)
    return fsum((one - middle) ** 2 for one in values) / (len(values) - 1)


def t_tail(t: float, dof: float) -> float:
    """Return the probability that Student's t lies above a value."""
    if t == inf:
        return 0.0
    from scipy.special import stdtr  # noqa: PLC0415 - scipy waits until it is needed

    return float(stdtr(dof, -t))


def t_quantile(probability: float, dof: float) -> float:
    """Return the quantile of Student's t."""
    from scipy.special import stdtrit  # noqa: PLC0415 - scipy waits until it is needed

    return float(stdtrit(dof, probability))


def _f_tail(value: float, first: float, second: float) -> float:
    if value == inf:
        return 0.0
    from scipy.special import fdtrc  # noqa: PLC0415 - scipy waits until it is needed

    return float(fdtrc(first, second, value))


def _needed(groups: Groups, *, least: int = 2) -> None:
    if len(groups) < 2:
        raise GroupProblem("A comparison needs at least two groups.")
    if min(map(len, groups)) < least:
        raise GroupProblem(f"Every group needs at least {least} values.")


def one_way_anova(groups: Groups) -> TestResult:
    """Return the classical analysis of variance of equal spreads: F between over within.

    Raises:
        GroupProblem: fewer than two groups, a group without two values, no scatter at all.
    """
    _needed(groups)
    everything = [one for group in groups for one in group]
    grand = mean_of(everything)
    between = fsum(len(group) * (mean_of(group) - grand) ** 2 for group in groups)
    within = fsum((len(group) - 1) * variance_of(group) for group in groups)
    dof = (float(len(groups) - 1), float(len(everything) - len(groups)))
    if within == 0:
        raise GroupProblem("The values do not scatter within any group.")
    F = (between / dof[0]) / (within / dof[1])
    return TestResult("analysis of variance", F, dof, _f_tail(F, *dof))


def welch_anova(groups: Groups) -> TestResult:
    """Return Welch's analysis of variance for unequal spreads (Biometrika 38 (1951) 330).

    Raises:
        GroupProblem: fewer than two groups, a group without two values or without scatter.
    """
    _needed(groups)
    variances = [variance_of(group) for group in groups]
    if min(variances) == 0:
        raise GroupProblem("One group does not scatter; Welch's test divides by its scatter.")
    weights = [len(group) / one for group, one in zip(groups, variances, strict=True)]
    means = [mean_of(group) for group in groups]
    total = fsum(weights)
    grand = fsum(w * m for w, m in zip(weights, means, strict=True)) / total
    k = len(groups)
    between = fsum(w * (m - grand) ** 2 for w, m in zip(weights, means, strict=True)) / (k - 1)
    excess = fsum(
        (1 - w / total) ** 2 / (len(group) - 1) for w, group in zip(weights, groups, strict=True)
    )
    F = between / (1 + 2 * (k - 2) / (k * k - 1) * excess)
    dof = (float(k - 1), (k * k - 1) / (3 * excess))
    return TestResult("Welch's analysis of variance", F, dof, _f_tail(F, *dof))


def welch_difference(first: Sequence[float], second: Sequence[float]) -> Difference:
    """Return the difference first less second with u and Welch-Satterthwaite's dof.

    Raises:
        GroupProblem: a group without two values.
    """
    _needed([first, second])
    a, b = variance_of(first) / len(first), variance_of(second) / len(second)
    value = mean_of(first) - mean_of(second)
    if a + b == 0:
        return Difference(value, 0.0, inf)
    dof = (a + b) ** 2 / (a * a / (len(first) - 1) + b * b / (len(second) - 1))
    return Difference(value, sqrt(a + b), dof)


def paired_difference(first: Sequence[float], second: Sequence[float]) -> Difference:
    """Return the mean of the differences pair by pair, its u and dof.

    Raises:
        GroupProblem: unequally many values, or fewer than two.
    """
    if len(first) != len(second):
        raise GroupProblem("Paired values must be equally many.")
    _needed([first, second])
    apart = [a - b for a, b in zip(first, second, strict=True)]
    n = len(apart)
    return Difference(mean_of(apart), sqrt(variance_of(apart) / n), float(n - 1))


def t_test(difference: Difference) -> TestResult:
    """Return the two-sided test that a difference is zero."""
    t = _ratio(abs(difference.value), difference.u)
    p = min(1.0, 2 * t_tail(t, difference.dof)) if difference.u else float(difference.value == 0)
    return TestResult("t test", t, (difference.dof,), p)


def two_one_sided(difference: Difference, margin: float) -> TestResult:
    """Return the two one-sided tests that a difference lies within ± margin (Schuirmann 1987).

    The p-value is the larger of the two; small means equal for practical purposes.
    """
    t = _ratio(margin - abs(difference.value), difference.u)
    if not difference.u:
        return TestResult("two one-sided tests", t, (difference.dof,), float(t <= 0))
    return TestResult("two one-sided tests", t, (difference.dof,), t_tail(t, difference.dof))


def _ratio(over: float, under: float) -> float:
    if under:
        return over / under
    return inf if over > 0 else -inf if over < 0 else 0.0


def brown_forsythe(groups: Groups) -> TestResult:
    """Return the test of equal spreads on distances to the median (Brown & Forsythe 1974).

    Raises:
        GroupProblem: fewer than two groups, a group without three values, no scatter.
    """
    _needed(groups, least=3)
    distances = [[abs(one - _median(group)) for one in group] for group in groups]
    found = one_way_anova(distances)
    return TestResult("Brown-Forsythe", found.statistic, found.dof, found.p)


def _median(values: Sequence[float]) -> float:
    ordered = sorted(values)
    middle = len(ordered) // 2
    if len(ordered) % 2:
        return ordered[middle]
    return (ordered[middle - 1] + ordered[middle]) / 2


def variance_ratio(first: Sequence[float], second: Sequence[float]) -> TestResult:
    """Return the two-sided F test on two variances, the larger above.

    Raises:
        GroupProblem: a group without two values, or the smaller variance is zero.
    """
    _needed([first, second])
    large, small = sorted(
        ((variance_of(one), float(len(one) - 1)) for one in (first, second)), reverse=True
    )
    if small[0] == 0:
        raise GroupProblem("One group does not scatter; a ratio of variances has no value.")
    F = large[0] / small[0]
    dof = (large[1], small[1])
    return TestResult("F test", F, dof, min(1.0, 2 * _f_tail(F, *dof)))


def paired_spread(first: Sequence[float], second: Sequence[float]) -> TestResult:
    """Return the test of equal spreads of paired values (Pitman 1939, Morgan 1939).

    Sums and differences of the pairs are uncorrelated where both scatter alike.

    Raises:
        GroupProblem: unequally many values, fewer than three, or no scatter.
    """
    if len(first) != len(second):
        raise GroupProblem("Paired values must be equally many.")
    _needed([first, second], least=3)
    a0, b0, n = mean_of(first), mean_of(second), len(first)
    sums = [a - a0 + b - b0 for a, b in zip(first, second, strict=True)]
    apart = [a - a0 - b + b0 for a, b in zip(first, second, strict=True)]
    both = fsum(s * s for s in sums) * fsum(d * d for d in apart)
    if both == 0:
        raise GroupProblem("The values do not scatter.")
    r = fsum(s * d for s, d in zip(sums, apart, strict=True)) / sqrt(both)
    t = _ratio(abs(r) * sqrt(n - 2), sqrt(max(1 - r * r, 0.0)))
    return TestResult("Pitman-Morgan", t, (float(n - 2),), min(1.0, 2 * t_tail(t, n - 2)))


def holm_adjusted(p_values: Sequence[float]) -> tuple[float, ...]:
    """Return p-values adjusted for their number (Holm, Scand. J. Stat. 6 (1979) 65)."""
    order = sorted(range(len(p_values)), key=lambda at: p_values[at])
    adjusted = [0.0] * len(p_values)
    highest = 0.0
    for rank, at in enumerate(order):
        highest = max(highest, min(1.0, (len(p_values) - rank) * p_values[at]))
        adjusted[at] = highest
    return tuple(adjusted)
