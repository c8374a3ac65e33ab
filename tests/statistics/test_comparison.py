"""Methods compared: the sentences follow the figures."""

import pytest

from server.statistics.comparison import MethodValues, Reference, compare_methods
from server.statistics.groups import GroupProblem

FIT = MethodValues("model fit", (0.10210, 0.10212, 0.10209, 0.10211, 0.10210, 0.10212))
FIRST = MethodValues("first derivative", (0.10211, 0.10215, 0.10206, 0.10212, 0.10208, 0.10214))
STEEPEST = MethodValues("steepest segment", (0.1024, 0.1027, 0.1022, 0.1029, 0.1023, 0.1026))


def test_comparison_names_the_method_that_scatters_least():
    found = compare_methods([STEEPEST, FIRST, FIT], paired=False)
    assert found.precision_says.startswith("“model fit” scatters least")
    assert "more than chance" in found.precision_says
    assert found.proposed == "model fit"


def test_comparison_methods_that_agree_do_not_matter():
    found = compare_methods([FIT, FIRST], paired=True)
    assert found.pairs[0].equality == "equal within the margin"
    assert found.matters_says == (
        "It does not matter: all methods agree within this laboratory's 0.1 %."
    )


def test_comparison_methods_apart_by_more_than_the_margin_matter():
    found = compare_methods([FIT, STEEPEST], paired=True)
    assert found.pairs[0].equality == "different"
    assert "differ by 0.401 %" in found.matters_says


def test_comparison_too_few_values_leave_it_undecided():
    few = [MethodValues(one.method, one.values[:3]) for one in (FIT, STEEPEST)]
    found = compare_methods(few, paired=False)
    assert found.pairs[0].equality == "not decided"
    assert "More replicates would tell." in found.matters_says
    assert "sees only large differences" in found.precision_says


def test_comparison_pairing_sees_what_independent_groups_hide():
    # the replicates scatter together, the methods differ by 0.02 % in each of them
    first = MethodValues("a", (0.1000, 0.1010, 0.0990, 0.1005, 0.0995))
    second = MethodValues("b", tuple(1.0002 * one for one in first.values))
    paired = compare_methods([first, second], paired=True)
    apart = compare_methods([first, second], paired=False)
    assert paired.pairs[0].equality == "equal within the margin"
    assert apart.pairs[0].equality == "not decided"


def test_comparison_pairs_on_the_flasks_that_both_name():
    flasks = ("1", "2", "3", "4", "5", "6")
    fit = MethodValues("model fit", FIT.values, flasks=flasks)
    first = MethodValues("first derivative", FIRST.values[1:], flasks=flasks[1:])
    colour = MethodValues("indicator", STEEPEST.values, flasks=tuple("abcdef"))
    found = compare_methods([fit, first, colour])
    assert [one.paired for one in found.pairs] == [True, False, False]
    rest = [MethodValues(one.method, one.values[1:]) for one in (FIT, FIRST)]
    alone = compare_methods(rest, paired=True)
    assert found.pairs[0].difference_percent == pytest.approx(
        alone.pairs[0].difference_percent, rel=1e-3
    )
    assert [one.name for one in found.spread] == [
        "Pitman-Morgan",
        "Brown-Forsythe",
        "Brown-Forsythe",
    ]
    assert found.means is None
    assert not found.paired


def test_comparison_one_common_flask_pairs_nothing():
    first = MethodValues("a", FIT.values, flasks=tuple("123456"))
    second = MethodValues("b", FIRST.values, flasks=tuple("6789xy"))
    assert not compare_methods([first, second]).pairs[0].paired


def test_comparison_more_than_two_unpaired_methods_have_a_test_of_equal_means():
    found = compare_methods([FIT, FIRST, STEEPEST])
    assert found.means.name == "Welch's analysis of variance"
    assert [one.name for one in found.spread] == ["Brown-Forsythe"]


def test_comparison_proposes_the_smallest_u_and_not_the_smallest_scatter_alone():
    sure = MethodValues("first derivative", FIRST.values, 0.00001)
    precise = MethodValues("gran alkaline side", FIT.values, 0.0002)
    unknown = MethodValues("indicator", FIT.values)
    assert compare_methods([precise, sure, unknown]).proposed == "first derivative"


def test_comparison_trueness_is_told_against_a_reference():
    found = compare_methods(
        [FIT, STEEPEST], paired=True, reference=Reference(0.10210, 0.00003, "the certificate")
    )
    assert [one.En <= 1 for one in found.trueness] == [True, False]
    assert "“model fit” lies nearest to the certificate" in found.trueness_says
    assert "beyond their uncertainty lie “steepest segment”" in found.trueness_says


def test_comparison_precise_but_untrue_method_is_not_proposed():
    biased = MethodValues("gran acid side", tuple(one + 0.001 for one in FIT.values))
    found = compare_methods([biased, FIRST], paired=False, reference=Reference(0.1021, 0.00003))
    assert found.proposed == "first derivative"


def test_comparison_without_reference_says_that_trueness_is_open():
    assert "cannot be said" in compare_methods([FIT, FIRST], paired=True).trueness_says


def test_comparison_E_n_uses_unshared_parts_only():
    # E_n = |difference| / (2 sqrt(s²/n + u_method² + u_reference²)), by hand
    one = MethodValues("m", (1.0, 1.2), u_systematic=0.3)
    found = compare_methods([one, one], paired=False, reference=Reference(1.5, 0.4))
    assert found.trueness[0].En == pytest.approx(0.4 / (2 * (0.01 + 0.09 + 0.16) ** 0.5))


@pytest.mark.parametrize(
    ("groups", "paired", "margin", "says"),
    [
        ([FIT], False, 0.1, "two methods"),
        ([FIT, MethodValues("x", (1.0,))], False, 0.1, "“x” has fewer"),
        ([FIT, MethodValues("x", (1.0, 2.0))], True, 0.1, "equally many"),
        ([FIT, FIRST], True, 0.0, "margin"),
        ([FIT, MethodValues("x", (1.0, 2.0), flasks=("1",))], False, 0.1, "one flask for each"),
    ],
)
def test_comparison_that_cannot_be_made_is_refused(groups, paired, margin, says):
    with pytest.raises(GroupProblem, match=says):
        compare_methods(groups, paired=paired, margin_percent=margin)
