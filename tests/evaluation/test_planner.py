"""The plan before the first weighing against what the evaluation then finds."""

import json
from itertools import product
from pathlib import Path

import pytest

from server.evaluation.assembly import SheetMaterials
from server.evaluation.circumstances import Circumstances, Pooled
from server.evaluation.entrance import evaluate
from server.evaluation.mass_window import mass_window
from server.evaluation.planned_changes import changes_for
from server.evaluation.planned_record import Situation, evaluate_planned
from server.evaluation.planner import AIM, plan
from server.lab.refusal import Unacceptable

QUAM = json.loads(
    (Path(__file__).parents[1] / "reference" / "records" / "quam-a2.json").read_text("utf-8")
)


def materials(**changed):
    """Return QUAM:2012 example A2 as a recipe, a lot and instruments."""
    stated = {
        "titrant_substance": "NaOH", "nominal": "0.1", "ratio": "1",
        "liquid_expansion": QUAM["liquid_expansion"], "standard": QUAM["standard"],
        "balance": {"linearity": QUAM["balance"]["linearity"]}, "burette": QUAM["burette"],
        "thermometer": {"reading": {"unit": "Cel", "u": QUAM["temperature"]["u"]}},
        "repeatability": QUAM["repeatability"], "replicates_wanted": 3, "entries": (),
    }  # fmt: skip
    return SheetMaterials(**(stated | changed))


def evaluated():
    found = evaluate(QUAM)["concentration"]
    return 100 * found["U"] / found["value"]


def test_planned_U_agrees_with_the_evaluated_one_of_quam_a2():
    # QUAM:2012, A2: c = 0.10214 mol/L, u = 0.00010 mol/L, so U = 0.20 %
    assert plan(materials()).counts[0].U_percent == pytest.approx(evaluated(), rel=0.10)
    as_weighed = plan(materials(nominal="0.10214"), mass_g=0.3888)
    assert as_weighed.counts[0].U_percent == pytest.approx(evaluated(), rel=1e-3)
    assert as_weighed.volume_mL == pytest.approx(18.64, abs=0.002)
    assert evaluated() == pytest.approx(100 * 2 * 0.00010 / 0.10214, rel=0.05)


def test_window_delivers_60_to_90_percent_of_the_burette():
    found = plan(materials())
    tabled = mass_window("NaOH", "KHP", nominal_mol_L=0.1, capacity_mL=20.0)
    assert found.window_g == pytest.approx((tabled.low_g, tabled.high_g), rel=1e-4)
    assert found.mass_g == pytest.approx(AIM * tabled.high_g / 0.9, rel=1e-4)
    assert found.volume_mL == pytest.approx(AIM * 20)


def test_burette_dominates_quam_a2():
    found = plan(materials())
    assert found.dominant[0].source == "burette"
    assert found.dominant[0].shared
    assert sum(one.percent for one in found.dominant) <= 100.0 + 1e-9


def test_more_replicates_shrink_only_what_is_not_shared():
    spread = {"relative_u": "0.001", "dof": "24"}
    found = plan(materials(repeatability=spread))
    U = [one.U_percent for one in found.counts]
    assert [one.n for one in found.counts] == [3, 4, 5, 6, 7, 8]
    assert sorted(U, reverse=True) == U
    # the whole of it: u_n² = shared² + s²/n, with k = 2 throughout here
    assert {one.k for one in found.counts} == {2.0}
    shared = (U[0] / 200) ** 2 - 0.001**2 / 3
    for n, one in zip(range(3, 9), U, strict=True):
        assert one == pytest.approx(200 * (shared + 0.001**2 / n) ** 0.5, rel=1e-6)


def test_spread_of_the_mean_does_not_shrink_with_replicates():
    U = {round(one.U_percent, 9) for one in plan(materials()).counts}
    assert len(U) == 1


def test_pooled_spread_counts_where_the_recipe_states_none():
    stated = plan(materials(repeatability={"relative_u": "0.001", "dof": "24"}))
    pooled = plan(materials(repeatability=None), pooled=Pooled(0.001, 24.0))
    assert pooled.counts == stated.counts
    nobody = plan(materials(repeatability=None), spread_limit_percent=0.2)
    assert nobody.counts[0].U_percent > pooled.counts[0].U_percent
    assert any("limit of spread" in one for one in nobody.assumed)


def every_set(found_materials, wanted, **asked):
    """Return the least cost of all sets of changes that reach the wanted U, one by one."""
    start = Situation(found_materials, Circumstances(), asked.get("replicates", 3), AIM)
    groups = {}
    for one in changes_for(start):
        groups.setdefault(one.group, [None]).append(one)
    reached = []
    for chosen in product(*groups.values()):
        taken = [one for one in chosen if one]
        situation = start
        for one in taken:
            situation = one.apply(situation)
        if evaluate_planned(situation).U_percent <= wanted:
            reached.append((sum(c.bought for c in taken), sum(c.minutes for c in taken)))
    return min(reached, default=None)


@pytest.mark.parametrize("wanted", [0.25, 0.205, 0.20, 0.17, 0.14, 0.11, 0.05])
def test_cheapest_way_is_the_cheapest_of_all_sets(wanted):
    spread = {"relative_u": "0.0008", "dof": "20"}
    recipe = materials(repeatability=spread)
    found = plan(recipe, wanted_percent=wanted)
    least = every_set(recipe, wanted)
    if found.reached:
        assert found.cheapest is None
        assert least == (0, 0)
    elif least is None:
        assert found.cheapest is None
        assert "Nothing known here" in found.says
    else:
        assert (int(found.cheapest.bought), found.cheapest.minutes) == least
        assert found.cheapest.U_percent <= wanted
        assert found.cheapest.says in found.says


def test_ways_are_told_one_by_one_cheapest_first():
    found = plan(materials(), wanted_percent=0.15)
    costs = [(one.bought, one.minutes) for one in found.ways]
    assert costs == sorted(costs)
    assert {one.changes[0] for one in found.ways} == {
        "mass", "temperature", "balance", "burette", "standard",
    }  # fmt: skip
    assert all(one.U_percent < found.counts[0].U_percent for one in found.ways)


def test_own_minutes_of_the_laboratory_change_what_is_cheapest():
    spread = {"relative_u": "0.0030", "dof": "20"}
    recipe = materials(repeatability=spread)
    usual = plan(recipe, wanted_percent=0.37)
    dear = {"mass": 0, "temperature": 5, "replicate": 900, "burette": 180, "balance": 120,
            "standard": 0}  # fmt: skip
    other = plan(recipe, wanted_percent=0.37, minutes=dear)
    assert any("replicates" in one for one in usual.cheapest.changes)
    assert not any("replicates" in one for one in other.cheapest.changes)


@pytest.mark.parametrize("weighing", ["difference", "tared"])
def test_tables_buoyancy_and_blank_are_planned_as_the_bench_writes_them(weighing):
    found = plan(
        materials(
            weighing=weighing, buoyancy=True, blank_kind="reagent",
            balance={
                "linearity": {"unit": "g", "u": "0.0001"},
                "error_table": [["0", "0"], ["25", "0.0002"], ["50", "0.0005"]],
            },
            burette={
                "capacity": {"value": "20", "unit": "mL"},
                "delivery": {"unit": "mL", "u": "0.004"},
                "error_table": [["0", "0"], ["10", "0.01"], ["19", "-0.005"]],
            },
            room={"temperature": {"unit": "Cel", "u": "0.5"},
                  "pressure": {"unit": "hPa", "u": "2"}, "humidity": {"unit": "%", "u": "5"}},
        )
    )  # fmt: skip
    # the table ends at 19 mL, and so does what can be used
    assert found.volume_mL == pytest.approx(AIM * 19)
    assert found.counts[0].U_percent < evaluated()


def test_aliquot_and_titrant_routes_take_their_volume_from_the_pipette():
    pipette = {"delivery": {"value": "15", "unit": "mL", "u": "0.01"}}
    aliquot = plan(
        materials(
            route="aliquot", standard=None, balance=None, pipette=pipette,
            solution={"concentration": {"value": "0.1", "unit": "mol/L", "u": "0.0001"}},
        )
    )  # fmt: skip
    assert aliquot.window_g is None
    assert aliquot.mass_g is None
    assert aliquot.volume_mL == pytest.approx(15.0, rel=2e-3)
    reference = {"substance": "HCl", "concentration": {"value": "0.2", "unit": "mol/L",
                                                      "u": "0.0001"}}  # fmt: skip
    common = {"route": "against-titrant", "standard": None, "balance": None, "ratio": "1",
              "reference": reference}  # fmt: skip
    small = {"delivery": {"value": "8", "unit": "mL", "u": "0.01"}}
    in_burette = plan(materials(**common, unknown_in="burette", pipette=small))
    assert in_burette.volume_mL == pytest.approx(16.0, rel=2e-3)
    in_flask = plan(materials(**common, unknown_in="flask", pipette=pipette))
    assert in_flask.volume_mL == pytest.approx(7.5, rel=2e-3)
    with pytest.raises(Unacceptable, match="smaller pipette"):
        plan(materials(**common, unknown_in="burette", pipette=pipette))


@pytest.mark.parametrize(
    ("asked", "says"),
    [({"mass_g": 0.5}, "the burette holds 20 mL"), ({"mass_g": 0.0}, "above zero")],
)
def test_mass_that_cannot_be_titrated_is_refused(asked, says):
    with pytest.raises(Unacceptable, match=says):
        plan(materials(), **asked)


def test_small_or_odd_mass_is_told():
    assert any("smallest sample" in one for one in plan(materials(), least_g=0.4).assumed)
    assert any("outside the window" in one for one in plan(materials(), mass_g=0.2).assumed)


def test_plan_without_capacity_or_reaction_is_refused():
    with pytest.raises(Unacceptable, match="capacity"):
        plan(materials(burette={"delivery": {"unit": "mL", "u": "0.01"}}))
    with pytest.raises(Unacceptable, match="reaction"):
        plan(materials(ratio=None, standard={**QUAM["standard"], "substance": "NaCl"}))
