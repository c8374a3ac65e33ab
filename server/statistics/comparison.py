"""Comparing end-point methods on one lot: precision, trueness, and whether it matters."""

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import combinations
from math import hypot, sqrt
from typing import Literal

from server.statistics.groups import (
    Difference,
    GroupProblem,
    TestResult,
    brown_forsythe,
    holm_adjusted,
    mean_of,
    paired_difference,
    paired_spread,
    t_quantile,
    t_test,
    two_one_sided,
    variance_ratio,
    welch_anova,
    welch_difference,
)
from server.statistics.spread import Summary, summarize

_LEVEL = 0.05
USUAL_MARGIN_PERCENT = 0.1
_FEW = 3

Equality = Literal["equal within the margin", "different", "not decided"]


@dataclass(frozen=True, slots=True)
class MethodValues:
    """The values of one method, in the unit of the concentration, replicate by replicate.

    ``u_systematic`` is what its replicates share of u and the reference does not; without a
    reference the method's own part. 0: not known.
    ``flasks`` names the flask of each value, where some methods saw the same ones and others not.
    """

    method: str
    values: tuple[float, ...]
    u_systematic: float = 0.0
    flasks: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Reference:
    """A stated value to be true to, with the part of its u that the methods do not share."""

    value: float
    u_unshared: float
    name: str = "the stated value"


@dataclass(frozen=True, slots=True)
class Pair:
    """Two methods side by side: difference in percent of their mean, its 95 % interval, verdict.

    ``p`` is Holm-adjusted; ``p_equal`` that of the two one-sided tests against the margin.
    ``paired``: from the same flasks, difference by difference. ``p_spread`` is that of equal
    scatter (Pitman-Morgan where paired, else Brown-Forsythe); None with too few values.
    """

    first: str
    second: str
    difference_percent: float
    ci95_percent: tuple[float, float]
    p: float
    p_equal: float
    equality: Equality
    paired: bool
    p_spread: float | None


@dataclass(frozen=True, slots=True)
class Trueness:
    """A method against the reference: difference in percent and E_n (beyond 1: not true)."""

    method: str
    difference_percent: float
    En: float


@dataclass(frozen=True, slots=True)
class Comparison:
    """Methods compared: a summary of each, tests, pairs, and three plain sentences.

    ``spread`` are the tests of equal scatter, ``means`` the test of equal means of more than two
    unpaired methods. ``paired``: all of them are. ``proposed`` is never taken by itself: a person
    chooses.
    """

    methods: tuple[str, ...]
    summaries: tuple[Summary, ...]
    paired: bool
    margin_percent: float
    spread: tuple[TestResult, ...]
    means: TestResult | None
    pairs: tuple[Pair, ...]
    trueness: tuple[Trueness, ...]
    precision_says: str
    trueness_says: str
    matters_says: str
    proposed: str


def compare_methods(
    groups: Sequence[MethodValues],
    *,
    paired: bool = False,
    margin_percent: float = USUAL_MARGIN_PERCENT,
    reference: Reference | None = None,
) -> Comparison:
    """Return a comparison of two or more methods.

    ``paired``: all values come from the same curves or flasks, in the same order. Without it two
    methods are paired on the flasks that both name, where there are at least two of them.
    ``margin_percent`` is the difference that does not matter in this laboratory.

    Raises:
        GroupProblem: fewer than two methods, fewer than two values, unequally many where paired,
            not a flask for each value where flasks are named, or a margin that is not above zero.
    """
    _check(groups, paired=paired, margin_percent=margin_percent)
    summaries = tuple(summarize(one.values) for one in groups)
    meetings = tuple(_meet(a, b, paired=paired) for a, b in combinations(groups, 2))
    pairs = _pairs(meetings, margin_percent=margin_percent)
    spread = _spread(groups, meetings)
    true = tuple(
        _trueness(one, summary, reference)
        for one, summary in zip(groups, summaries, strict=True)
        if reference is not None
    )
    return Comparison(
        methods=tuple(one.method for one in groups),
        summaries=summaries,
        paired=all(one.paired for one in meetings),
        margin_percent=margin_percent,
        spread=spread,
        means=_means(groups, meetings),
        pairs=pairs,
        trueness=true,
        precision_says=_precision_words(groups, summaries, spread),
        trueness_says=_trueness_words(true, reference),
        matters_says=_matters_words(pairs, margin_percent),
        proposed=_proposed(groups, summaries, true),
    )


@dataclass(frozen=True, slots=True)
class _Meeting:
    """Two methods and the values of each that are set against each other."""

    first: MethodValues
    second: MethodValues
    values: tuple[tuple[float, ...], tuple[float, ...]]
    paired: bool


def _meet(first: MethodValues, second: MethodValues, *, paired: bool) -> _Meeting:
    if paired:
        return _Meeting(first, second, (first.values, second.values), paired=True)
    there = dict(zip(second.flasks, second.values, strict=False))
    both = [
        (one, there[flask])
        for flask, one in zip(first.flasks, first.values, strict=False)
        if flask in there
    ]
    if len(both) < 2:
        return _Meeting(first, second, (first.values, second.values), paired=False)
    mine, other = zip(*both, strict=True)
    return _Meeting(first, second, (mine, other), paired=True)


def _check(groups: Sequence[MethodValues], *, paired: bool, margin_percent: float) -> None:
    if len(groups) < 2:
        raise GroupProblem("A comparison needs at least two methods.")
    if not margin_percent > 0:
        raise GroupProblem("The margin must be above zero.")
    for one in groups:
        if len(one.values) < 2:
            raise GroupProblem(f"The method “{one.method}” has fewer than two values.")
    if paired and len({len(one.values) for one in groups}) > 1:
        raise GroupProblem("Methods from the same curves must have equally many values.")
    for one in groups:
        if one.flasks and len(set(one.flasks)) != len(one.values):
            raise GroupProblem(f"The method “{one.method}” needs one flask for each value.")


def _pairs(meetings: Sequence[_Meeting], *, margin_percent: float) -> tuple[Pair, ...]:
    apart = [
        (paired_difference if one.paired else welch_difference)(*one.values) for one in meetings
    ]
    adjusted = holm_adjusted([t_test(one).p for one in apart])
    made = []
    for one, difference, p in zip(meetings, apart, adjusted, strict=True):
        per = 100 / abs((mean_of(one.first.values) + mean_of(one.second.values)) / 2)
        margin = margin_percent / per
        half = t_quantile(0.975, difference.dof) * difference.u if difference.u else 0.0
        p_equal = two_one_sided(difference, margin).p
        made.append(
            Pair(
                one.first.method,
                one.second.method,
                per * difference.value,
                (per * (difference.value - half), per * (difference.value + half)),
                p,
                p_equal,
                _equality(difference, margin, p, p_equal),
                one.paired,
                _p_spread(one),
            )
        )
    return tuple(made)


def _equality(difference: Difference, margin: float, p: float, p_equal: float) -> Equality:
    if p_equal < _LEVEL:
        return "equal within the margin"
    if p < _LEVEL and abs(difference.value) > margin:
        return "different"
    return "not decided"


def _spread(groups: Sequence[MethodValues], meetings: Sequence[_Meeting]) -> tuple[TestResult, ...]:
    """Return one test of all where no two share flasks, else a test of every two."""
    values = [one.values for one in groups]
    tests: list[TestResult] = []
    try:
        if any(one.paired for one in meetings):
            tests = [_spread_of_two(one) for one in meetings]
        else:
            tests.append(brown_forsythe(values))
            if len(values) == 2:
                tests.append(variance_ratio(*values))
    except GroupProblem:
        return tuple(tests)
    return tuple(tests)


def _p_spread(one: _Meeting) -> float | None:
    try:
        return _spread_of_two(one).p
    except GroupProblem:
        return None


def _spread_of_two(one: _Meeting) -> TestResult:
    return paired_spread(*one.values) if one.paired else brown_forsythe(one.values)


def _means(groups: Sequence[MethodValues], meetings: Sequence[_Meeting]) -> TestResult | None:
    if len(groups) == 2 or any(one.paired for one in meetings):
        return None
    try:
        return welch_anova([one.values for one in groups])
    except GroupProblem:
        return None


def _trueness(one: MethodValues, summary: Summary, reference: Reference | None) -> Trueness:
    if reference is None:
        raise GroupProblem("There is no reference to be true to.")
    u = hypot(_u_of_mean(one, summary), reference.u_unshared)
    apart = summary.mean - reference.value
    En = abs(apart) / (2 * u) if u else float("inf") if apart else 0.0
    return Trueness(one.method, 100 * apart / abs(reference.value), En)


def _precision_words(
    groups: Sequence[MethodValues], summaries: Sequence[Summary], spread: Sequence[TestResult]
) -> str:
    ordered = sorted(
        (
            (summary.rsd_percent or 0.0, one.method)
            for one, summary in zip(groups, summaries, strict=True)
        )
    )
    (least, best), (most, worst) = ordered[0], ordered[-1]
    few = min(summary.n for summary in summaries) <= _FEW
    weak = " With so few values such a test sees only large differences." if few else ""
    said = f"“{best}” scatters least ({least:.3f} %), “{worst}” most ({most:.3f} %)"
    if not spread:
        return f"{said}; too few values to test whether that is chance."
    # one Brown-Forsythe stands for all; of tests on every two the smallest p counts, times their
    # number (Bonferroni)
    by_twos = any(one.name == "Pitman-Morgan" for one in spread)
    p = min(1.0, min(one.p for one in spread) * len(spread)) if by_twos else spread[0].p
    if p < _LEVEL:
        return f"{said}; that is more than chance (p {p:.3f}).{weak}"
    return f"{said}; chance alone may make that difference (p {p:.2f}).{weak}"


def _trueness_words(true: Sequence[Trueness], reference: Reference | None) -> str:
    if reference is None or not true:
        return "No reference value was given, so which method is the truer cannot be said."
    nearest = min(true, key=lambda one: abs(one.difference_percent))
    off = [one for one in true if one.En > 1]
    said = (
        f"“{nearest.method}” lies nearest to {reference.name} ({nearest.difference_percent:+.3f} %)"
    )
    if not off:
        return f"{said}; all methods agree with it within their uncertainty."
    names = ", ".join(f"“{one.method}” ({one.difference_percent:+.3f} %)" for one in off)
    return f"{said}; beyond their uncertainty lie {names}."


def _matters_words(pairs: Sequence[Pair], margin_percent: float) -> str:
    different = [one for one in pairs if one.equality == "different"]
    open_ = [one for one in pairs if one.equality == "not decided"]
    if different:
        worst = max(different, key=lambda one: abs(one.difference_percent))
        return (
            f"It matters: “{worst.first}” and “{worst.second}” differ by "
            f"{abs(worst.difference_percent):.3f} %, more than this laboratory's "
            f"{margin_percent:g} %."
        )
    if open_:
        worst = max(open_, key=lambda one: max(map(abs, one.ci95_percent)))
        low, high = worst.ci95_percent
        return (
            f"Not decided at this laboratory's {margin_percent:g} %: “{worst.first}” less "
            f"“{worst.second}” lies between {low:+.3f} and {high:+.3f} %. More replicates would "
            "tell."
        )
    return f"It does not matter: all methods agree within this laboratory's {margin_percent:g} %."


def _proposed(
    groups: Sequence[MethodValues], summaries: Sequence[Summary], true: Sequence[Trueness]
) -> str:
    """Return the method whose mean has the smallest u, of those that are true if a value is stated.

    Both count: how a method scatters, and what it is uncertain by itself. A method of which the
    latter is not known is proposed only where it is known of none.
    """
    holding = {one.method for one in true if one.En <= 1}
    both = list(zip(groups, summaries, strict=True))
    both = [one for one in both if one[0].method in holding] or both
    both = [one for one in both if one[0].u_systematic > 0] or both
    return min(both, key=lambda one: _u_of_mean(*one))[0].method


def _u_of_mean(one: MethodValues, summary: Summary) -> float:
    return hypot((summary.s or 0.0) / sqrt(summary.n), one.u_systematic)
