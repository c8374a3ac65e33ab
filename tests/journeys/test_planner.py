"""The plan of QUAM's example A2 against the sheet that is then written and evaluated.

Published: EURACHEM/CITAC Guide CG 4, third edition (2012), example A2: 0.3888 g of KHP, 18.64 mL,
c(NaOH) = 0.10214 mol/L, U = 0.00020 mol/L (k = 2), so U/c = 0.20 %.
"""

import re

import pytest

from server.procedures.hand_in import failing
from server.procedures.stores import WriteRecipe, write_recipe
from server.records.tables.stores import Recipe
from server.sheets.bench_home import open_begin
from server.sheets.planner_page import PlanAsked, open_planner

QUAM_A2 = ("60.5450", "60.1562", "0.00", "18.64")


def planned(quam, **asked):
    ready = quam.read(open_planner, PlanAsked(**asked), actor=quam.people["analyst"])
    return ready.finish()


def percent(words):
    return float(words.removesuffix(" %"))


def expected(page):
    """Return the U in percent that a plan expects of the number of replicates planned."""
    says = re.search(r"U = ([0-9.]+) %", page.plan.says)
    return float(says[1])


def evaluated(quam):
    sheet = quam.begin()
    quam.titrate(sheet, QUAM_A2)
    concentration = quam.evaluate(sheet).result["concentration"]
    return 100 * concentration["U"] / concentration["value"]


def test_planned_U_of_quam_a2_agrees_with_the_evaluated_one_within_ten_percent(quam):
    found = evaluated(quam)
    assert expected(planned(quam)) == pytest.approx(found, rel=0.10)
    # with the mass that was weighed: to the digits that the page shows
    assert expected(planned(quam, mass_g="0.3888")) == pytest.approx(found, rel=0.01)
    assert found == pytest.approx(100 * 0.00020 / 0.10214, rel=0.03)


def test_begin_page_plans_with_what_it_proposes(quam):
    begin = quam.read(open_begin, quam.bottle, recipe_id=None, actor=quam.people["analyst"])
    page = planned(quam)
    assert begin.plan == page.plan
    # 60 to 90 % of 20 mL at 0.1 mol/L: 0.245 to 0.368 g of KHP by its molar mass
    assert begin.mass_window == "0.245 to 0.368 g of KHP for 60 to 90 % of Burette 1 (20 mL)"
    assert begin.plan_url.startswith(f"/planner?recipe_id={quam.recipe}&standard_lot_id={quam.khp}")


def test_plan_shows_three_to_eight_replicates_and_what_dominates(quam):
    page = planned(quam, replicates="4")
    assert [one.n for one in page.plan.counts] == [3, 4, 5, 6, 7, 8]
    assert [one.n for one in page.plan.counts if one.chosen] == [4]
    # QUAM:2012, figure A2.9: the volume is by far the largest
    assert page.plan.dominant[0].source == "burette"
    assert page.plan.dominant[0].shared


def test_wanted_U_gets_the_cheapest_way_and_each_change_alone(quam):
    page = planned(quam, wanted_percent="0,15")
    assert page.plan.wanted == "0.15 %"
    assert page.plan.cheapest is not None
    assert percent(page.plan.cheapest.U) <= 0.15
    assert page.plan.cheapest.reaches
    assert all(percent(one.U) <= expected(page) for one in page.plan.ways)
    enough = planned(quam, wanted_percent="0.5")
    assert (enough.plan.ways, enough.plan.cheapest) == ((), None)
    assert "within the wanted 0.5 %" in enough.plan.says


def test_plan_takes_the_spread_of_earlier_sheets_where_the_recipe_states_none(quam):
    document = quam.transactions.read(lambda s: s.get_one(Recipe, quam.recipe).document)
    document = {**document, "replicates": 3}
    del document["repeatability"]
    quam.recipe = quam.act(write_recipe, WriteRecipe("Own spread", document), "keeper")
    before = planned(quam, recipe_id=quam.recipe)
    assert any("limit of spread" in one for one in before.plan.assumed)

    sheet = quam.begin()
    quam.titrate(
        sheet,
        ("60.3200", "60.0000", "0.00", "15.34"),
        ("60.3210", "60.0000", "0.00", "15.39"),
        ("60.3190", "60.0000", "0.00", "15.30"),
    )
    failing_now = failing(quam.evaluate(sheet).result["findings"])
    quam.hand_in(sheet, **{name.replace(" ", "_"): "seen" for name in failing_now})
    quam.countersign(sheet, *failing_now)
    after = planned(quam, recipe_id=quam.recipe)

    assert any("1 earlier sheet" in one for one in after.plan.assumed)
    assert expected(after) < expected(before)
