"""Methods compared: on the countersigner's page, and over the sheets of a lot."""

import pytest

from server.lab.refusal import NotFound, NotSignedIn, Unacceptable
from server.records.queries.load_sheet import load_sheet_facts
from server.sheets.countersigning import open_countersign
from server.sheets.methods_page import MethodsAsked, open_methods


@pytest.fixture
def facts(demo):
    return demo.transactions.read(lambda s: load_sheet_facts(s, demo.summary.curve_sheet_id))


@pytest.fixture
def opened(demo, facts):
    def read(**asked):
        return demo.read(open_methods, facts.lot.code, MethodsAsked(**asked), who="ottilie")

    return read


def test_countersigner_sees_the_methods_of_a_sheet_with_curves(demo, facts) -> None:
    page = demo.read(open_countersign, facts.id, who="ottilie")
    view = page.methods
    assert view.problem == ""
    assert [row.method for row in view.rows if row.taken] == ["model fit"]
    assert "scatters least" in view.precision
    assert "No reference value was given" in view.trueness
    assert view.matters.startswith(("It matters", "It does not matter", "Not decided"))
    assert "Proposed for this recipe: “" in view.proposal
    assert view.chart.startswith("<svg")
    assert (view.margin, view.margin_basis[:15]) == ("0.1 %", "common practice")


def test_countersigner_of_a_sheet_by_eye_sees_no_comparison(demo) -> None:
    page = demo.read(open_countersign, demo.summary.waiting_sheet_id, who="ottilie")
    assert page.methods is None


def test_means_of_the_methods_are_those_of_the_signed_result(opened, facts) -> None:
    result = facts.evaluation.result
    rows = {row.method: row for row in opened().comparison.rows}
    for method in ("model fit", "first derivative"):
        values = [one["values"][method] for one in result["methods"]]
        assert float(rows[method].mean) == pytest.approx(sum(values) / len(values), abs=6e-7)
        assert rows[method].n == len(values)
    assert rows["model fit"].mean[:6] == f"{result['concentration']['value']:.4f}"


def test_every_pair_has_its_difference_interval_and_verdict(opened) -> None:
    view = opened().comparison
    n = len(view.rows)
    assert len(view.pairs) == n * (n - 1) // 2
    for pair in view.pairs:
        low, high = (float(end.split()[0]) for end in (pair.low, pair.high))
        assert low <= float(pair.difference.split()[0]) <= high
        assert pair.how == "paired"
        assert pair.verdict in {"holds", "look", "fails"}


def test_stated_value_tells_which_method_is_the_truer(opened, facts) -> None:
    c = facts.evaluation.result["concentration"]["value"]
    view = opened(reference=f"{c:.6f}".replace(".", ","), reference_U="0.00010").comparison
    assert "lies nearest to the stated value" in view.trueness
    assert view.reference.startswith("the stated value")
    assert all(row.En for row in view.rows)


def test_sheet_that_is_open_is_named_and_cannot_be_picked(opened) -> None:
    page = opened()
    assert [bool(one.refused) for one in page.sheets] == [not one.chosen for one in page.sheets]
    assert any(one.refused == "open: no certified result stands" for one in page.sheets)
    assert any(one.chosen for one in page.sheets)


def test_picked_sheets_alone_are_compared(opened, facts) -> None:
    page = opened(sheets=(facts.number,))
    assert [one.number for one in page.sheets if one.chosen] == [facts.number]
    unpicked = next(one.number for one in page.sheets if one.refused)
    none = opened(sheets=(unpicked,))
    assert none.comparison.problem == "No evaluated sheet was picked: there is nothing to compare."
    assert none.comparison.chart == ""


def test_lot_titrated_by_eye_alone_says_what_would_be_compared(demo) -> None:
    pages = [
        demo.read(open_methods, code, MethodsAsked(), who="imke")
        for code in demo.summary.bottles_in_force
    ]
    problems = [one.comparison.problem for one in pages]
    assert any(
        one.startswith("Only “indicator phenolphthalein” has two values") for one in problems
    )


def test_sheet_that_is_not_certified_is_named_and_not_compared(demo) -> None:
    facts = demo.transactions.read(lambda s: load_sheet_facts(s, demo.summary.waiting_sheet_id))
    page = demo.read(open_methods, facts.lot.code, MethodsAsked(), who="imke")
    assert [one.refused for one in page.sheets] == ["handed in: no certified result stands"]


@pytest.mark.parametrize(
    ("asked", "field"),
    [
        ({"reference": "much"}, "reference"),
        ({"reference": "0"}, "reference"),
        ({"reference": "-0.1"}, "reference"),
        ({"reference": "0.1", "reference_U": "x"}, "reference_U"),
        ({"reference_U": "0.0001"}, "reference"),
    ],
)
def test_odd_stated_value_is_refused_by_its_field(opened, asked, field) -> None:
    with pytest.raises(Unacceptable) as refused:
        opened(**asked)
    assert refused.value.field == field


def test_sheet_of_another_lot_and_visitors_are_refused(demo, facts, opened) -> None:
    with pytest.raises(NotFound, match="no bench sheet S-1"):
        opened(sheets=("S-1",))
    with pytest.raises(NotSignedIn):
        demo.read(open_methods, facts.lot.code, MethodsAsked(), who=None)


def test_methods_page_opens_as_many_statements_for_one_sheet_as_for_three(own_demo) -> None:
    summary = own_demo.summary
    facts = own_demo.transactions.read(lambda s: load_sheet_facts(s, summary.curve_sheet_id))
    asked = (facts.lot.code, MethodsAsked())
    before = own_demo.statements(open_methods, *asked, who="ottilie")
    for _ in range(2):
        own_demo.write(lambda s: own_demo.twin_sheet(s, summary.curve_sheet_id))
    page = own_demo.read(open_methods, *asked, who="ottilie")
    assert sum(one.chosen for one in page.sheets) == 3
    assert page.comparison.rows[-1].n == 3 * len(facts.evaluation.result["methods"])
    assert any("of the day" in note for note in page.comparison.notes)
    assert own_demo.statements(open_methods, *asked, who="ottilie") == before
