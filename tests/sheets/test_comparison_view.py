"""Methods compared in words: what is proposed is proposed, and nothing is chosen silently."""

import pytest

from server.evaluation.from_sheet import limits_of
from server.evaluation.methods_compared import ComparedMethods, LeftOut, StatedValue
from server.sheets.parts.comparison_view import MARGIN, comparison_view
from server.statistics.comparison import MethodValues, Reference, compare_methods

FLASKS = ("1", "2", "3", "4")
FIT = MethodValues("model fit", (0.10210, 0.10212, 0.10209, 0.10211), 2e-5, FLASKS)
FIRST = MethodValues("first derivative", (0.10211, 0.10215, 0.10206, 0.10212), 4e-5, FLASKS)
COLOUR = MethodValues("indicator", (0.1031, 0.1032, 0.1033), 1e-4, ("a", "b", "c"))


def seen(groups, *, taken=("model fit",), reference=None, margin=0.1, left_out=()):
    stated = reference and Reference(reference.value, reference.u, reference.name)
    found = ComparedMethods(
        sheets=("S-1",),
        groups=tuple(groups),
        taken=taken,
        left_out=left_out,
        margin_percent=margin,
        reference=reference,
        comparison=compare_methods(groups, margin_percent=margin, reference=stated),
        problem=None,
    )
    return comparison_view(found, margin_basis="set by the laboratory")


def test_proposal_names_what_the_number_rests_on_and_leaves_the_choice() -> None:
    view = seen([FIT, FIRST], taken=("first derivative",))
    assert "Proposed for this recipe: “model fit”" in view.proposal
    assert "The number rests on “first derivative”." in view.proposal
    assert view.proposal.endswith("the recipe's keeper chooses.")


def test_proposal_says_where_it_is_the_one_taken() -> None:
    assert seen([FIT, FIRST]).proposal.endswith("It is the one that was taken.")


def test_proposal_where_nothing_agrees_with_the_reference_says_so() -> None:
    far = StatedValue(0.2, 1e-5, "another laboratory")
    view = seen([FIT, FIRST], reference=far)
    assert "though no method agrees with the reference" in view.proposal
    assert view.reference == "another laboratory: 0.200000 ± 0.000020 mol/L (k = 2)"
    assert all(float(row.En) > 1 for row in view.rows)


def test_notes_tell_what_is_paired_and_what_is_not() -> None:
    assert "the others as groups (Welch)" in " ".join(seen([FIT, FIRST, COLOUR]).notes)
    assert "(paired)" in seen([FIT, FIRST]).notes[0]
    apart = seen([FIT, COLOUR])
    assert apart.notes[0].endswith("compared as groups (Welch).")
    assert [one.name for one in apart.tests] == ["Brown-Forsythe", "F test"]
    assert [one.how for one in seen([FIT, FIRST, COLOUR]).pairs] == [
        "paired", "unpaired", "unpaired",
    ]  # fmt: skip


def test_what_the_number_rests_on_is_set_against_each_other_method() -> None:
    view = seen([FIT, FIRST, COLOUR])
    assert view.against_taken == (
        "Seen from “model fit”, on which the number rests: equal within the margin: first "
        "derivative; different: indicator."
    )
    assert view.matters_verdict == "fails"
    assert seen([FIT, FIRST]).matters_verdict == "holds"


def test_wider_margin_of_the_laboratory_makes_a_difference_not_matter() -> None:
    assert seen([FIT, COLOUR], margin=0.1).matters.startswith("It matters")
    wide = seen([FIT, COLOUR], margin=2.0)
    assert wide.matters == "It does not matter: all methods agree within this laboratory's 2 %."
    assert (wide.margin, wide.margin_basis) == ("2 %", "set by the laboratory")


def test_margin_is_a_limit_of_recipe_before_laboratory_before_default() -> None:
    assert limits_of({}, {}).method_margin_percent == 0.1
    assert limits_of({MARGIN: "0.2"}, {}).method_margin_percent == 0.2
    recipe = limits_of({MARGIN: "0.2"}, {MARGIN: "0.05"})
    assert recipe.method_margin_percent == 0.05
    assert recipe.basis(MARGIN) == "set by the recipe"


def test_rows_have_the_mark_of_their_shape_and_methods_left_out_are_told() -> None:
    view = seen([FIT, FIRST], left_out=(LeftOut("gran acid side", "too few points."),))
    assert [row.shape for row in view.rows] == ["filled circle", "hollow square"]
    assert [row.taken for row in view.rows] == [True, False]
    assert [row.own_u for row in view.rows] == ["0.020 %", "0.039 %"]
    assert view.left_out == ("gran acid side: too few points.",)


@pytest.mark.parametrize(("scale", "decimals"), [(1.0, 6), (10.0, 5), (0.1, 7)])
def test_means_show_a_hundred_thousandth_of_themselves(scale, decimals) -> None:
    groups = [
        MethodValues(one.method, tuple(scale * value for value in one.values), flasks=one.flasks)
        for one in (FIT, FIRST)
    ]
    row = seen(groups).rows[0]
    assert len(row.mean.partition(".")[2]) == decimals
    assert row.own_u == ""
