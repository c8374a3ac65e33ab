"""Decision rules at, inside and outside a limit."""

import pytest

from server.metrology.conformity import GUARDED, RULES, SIMPLE, gravest, judge


@pytest.mark.parametrize(
    ("figure", "verdict"),
    [(0.0299, "holds"), (25.03 - 25, "holds"), (0.0301, "fails"), (-0.03, "holds"),
     (-0.0301, "fails"), (0.0, "holds")],
)  # fmt: skip
def test_simple_acceptance_takes_the_limit_itself(figure, verdict):
    assert judge(figure, 0.03, rule=SIMPLE, U=0.02).verdict == verdict


@pytest.mark.parametrize(
    ("figure", "verdict"),
    [(0.0199, "holds"), (0.02, "holds"), (0.0201, "look"), (0.03, "look"), (0.0301, "fails"),
     (-0.0201, "look")],
)  # fmt: skip
def test_guard_band_takes_the_limit_less_U(figure, verdict):
    found = judge(figure, 0.03, rule=GUARDED, U=0.01)
    assert found.verdict == verdict
    assert found.acceptance == pytest.approx(0.02)


def test_guard_band_wider_than_the_limit_lets_nothing_hold():
    assert judge(0.0, 0.03, rule=GUARDED, U=0.04).verdict == "look"


def test_judge_without_what_its_rule_needs_is_refused():
    with pytest.raises(ValueError, match="needs the expanded uncertainty"):
        judge(0.01, 0.03, rule=GUARDED)
    with pytest.raises(ValueError, match="decision rule"):
        judge(0.01, 0.03, rule="as we please")


def test_every_rule_says_what_it_is():
    assert set(RULES) == {SIMPLE, GUARDED}
    assert gravest([]) == "holds"
    assert gravest(["holds", "look", "fails"]) == "fails"
    assert gravest(["look", "holds"]) == "look"
