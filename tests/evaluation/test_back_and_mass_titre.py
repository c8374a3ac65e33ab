"""Back titrations and mass titres, worked by hand; the figures of the examples are invented."""

import copy
import json

import pytest

from server.evaluation.entrance import evaluate
from server.evaluation.record_fields import RecordProblem
from server.evaluation.snapshot import make_snapshot, replay

SURE = {"repeatability": {"relative_u": "0"}}


def to_standard():
    """Hydrochloric acid, 50 mL in excess to calcium carbonate; the rest by sodium hydroxide.

    0.2000 g of 100 g/mol are 2 mmol and take 4 mmol; 10.00 mL of 0.1 mol/L came back, 1 mmol:
    5 mmol in 50.00 mL, 0.1 mol/L.
    """
    return {
        "format": "bench-record/1",
        "titrant": {"substance": "HCl", "nominal": {"value": "0.1", "unit": "mol/L"}},
        "route": "back",
        "back": {"excess_to": "standard"},
        "standard": {
            "substance": "CaCO3",
            "mass_fraction": {"value": "1", "u": "0.0005", "id": "lot"},
            "molar_mass": {"value": "100", "unit": "g/mol"},
        },
        "reference": {
            "substance": "NaOH",
            "concentration": {"value": "0.1", "unit": "mol/L", "u": "0.0001"},
            "certificate": "TL-1",
            "components": [{"id": "burette", "relative": "0.0006"}],
        },
        "pipette": {"delivery": {"value": "50.00", "unit": "mL", "u": "0.01"}},
        "burette": {"delivery": {"unit": "mL", "u": "0.01", "id": "burette"}},
        "replicates": [{"mass": "0.2000", "burette": [["0.00", "10.00"]]}],
        **copy.deepcopy(SURE),
    }


def to_unknown():
    """20 mL of a lye get 25 mL of 0.1 mol/L acid; 5.00 mL of 0.1 mol/L lye come back: 0.1 mol/L."""
    record = to_standard()
    del record["standard"]
    record["titrant"]["substance"] = "KOH"
    record["pipette"]["delivery"]["value"] = "20.00"
    record["back"] = {
        "excess_to": "unknown",
        "added": {
            "substance": "HCl",
            "concentration": {"value": "0.1", "unit": "mol/L", "u": "0.0001"},
            "certificate": "TL-2",
            "delivery": {"value": "25.00", "unit": "mL", "u": "0.01"},
        },
    }
    record["replicates"] = [{"burette": [["0.00", "5.00"]]}]
    return record


def zero_by_blank():
    """The same, but nobody knows the acid: alone it takes 25.00 mL of the lye."""
    record = to_unknown()
    record["back"]["added"] = {"substance": "HCl"}
    record["blank"] = {"value": "25.00", "unit": "mL", "u": "0.01", "dof": "4", "kind": "zero"}
    return record


def mass_titre():
    """Iodine against a water standard of 10 mg/g.

    1.5000 g hold 15.00 mg, 20 µg/min over 5 min bring 0.10 mg; 15.10 mg in 3.020 mL are 5 mg/mL.
    """
    return {
        "format": "bench-record/1",
        "titrant": {
            "substance": "I2",
            "nominal": {"value": "5", "unit": "mg/mL"},
            "medium": "methanol",
        },
        "route": "mass-titre",
        "titre_of": "H2O",
        "standard": {
            "substance": "water standard",
            "mass_fraction": {"value": "0.01", "u": "0.00001", "id": "lot"},
        },
        "drift": {"rate": {"value": "20", "unit": "ug/min", "u": "2"}},
        "liquid_expansion": {"value": "1.2e-3", "unit": "1/K", "u": "1e-4"},
        "burette": {"capacity": {"value": "5", "unit": "mL"}},
        "replicates": [{"mass": "1.5000", "burette": [["0.000", "3.020"]], "minutes": "5.0"}],
        **copy.deepcopy(SURE),
    }


RECORDS = {
    "to standard": to_standard,
    "to unknown": to_unknown,
    "zero by blank": zero_by_blank,
    "mass titre": mass_titre,
}


def budget(result):
    return {row["source"]: row for row in result["budget"]}


def finding(result, name):
    return next(one for one in result["findings"] if one["name"] == name)


def test_back_excess_to_standard_gives_the_hand_worked_value_and_u():
    found = evaluate(to_standard())
    assert found["concentration"]["value"] == pytest.approx(0.1, rel=1e-12)
    # relative: lot 0.8 · 0.0005; pipette 0.0002; reference 0.2 · 0.001, of which the burette's
    # root 0.0006 adds to the burette's own 0.2 · 0.001
    left = 0.2 * (0.001**2 - 0.0006**2) ** 0.5
    burette = 0.2 * (0.0006 + 0.001)
    relative = (0.0004**2 + 0.0002**2 + left**2 + burette**2) ** 0.5
    assert found["concentration"]["u"] == pytest.approx(0.1 * relative, rel=1e-6)
    assert found["replicates"][0]["amount_mmol"] == pytest.approx(5.0)
    assert finding(found, "back titration")["figure"] == pytest.approx(20.0)


def test_back_excess_to_unknown_gives_the_hand_worked_value_and_u():
    record = to_unknown()
    del record["reference"]["components"]
    found = evaluate(record)
    assert found["concentration"]["value"] == pytest.approx(0.1, rel=1e-12)
    # mmol: added 2.5 · (0.001 and 0.0004), reference 0.5 · 0.001, burette 0.1 · 0.01; of 2 mmol
    parts = (2.5 * 0.001, 2.5 * 0.0004, 0.5 * 0.001, 0.1 * 0.01)
    relative = (sum((one / 2) ** 2 for one in parts) + 0.0005**2) ** 0.5
    assert found["concentration"]["u"] == pytest.approx(0.1 * relative, rel=1e-6)
    assert budget(found)["excess added"]["contribution"] == pytest.approx(5e-5, rel=1e-6)


def test_back_zero_by_blank_burette_error_cancels():
    # one filling of the same burette in the blank and in the titration: V_zero − V keeps no δ
    record = zero_by_blank()
    del record["reference"]["components"]
    found = evaluate(record)
    assert found["concentration"]["value"] == pytest.approx(0.1, rel=1e-12)
    rows = budget(found)
    assert rows["burette"]["contribution"] == pytest.approx(0.0, abs=1e-12)
    # 0.1 mol/L · 0.01 mL of 20 mL pipetted
    assert rows["blank that sets the zero"]["contribution"] == pytest.approx(5e-5, rel=1e-6)
    assert finding(found, "blank")["verdict"] == "holds"


def test_back_excluded_replicate_that_used_the_excess_up_stays_visible_without_a_value():
    record = to_unknown()
    record["replicates"].append({"burette": [["0.00", "26.00"]], "excluded": "no acid added"})
    found = evaluate(record)
    assert found["replicates"][1]["value"] is None
    assert found["concentration"]["value"] == pytest.approx(0.1, rel=1e-12)
    assert "No value came of it" in finding(found, "excluded")["says"]


def test_back_roots_of_the_reference_stay_in_the_components():
    found = evaluate(to_standard())
    components = {one["id"]: one["relative"] for one in found["components"]}
    assert components["burette"] == pytest.approx(0.2 * (0.0006 + 0.001), rel=1e-6)
    assert components["lot"] == pytest.approx(0.0004, rel=1e-6)


def test_back_more_than_half_comes_back_asks_to_look():
    record = to_unknown()
    record["replicates"] = [{"burette": [["0.00", "20.00"]]}]
    assert finding(evaluate(record), "back titration")["verdict"] == "look"


def test_mass_titre_gives_the_hand_worked_value_and_u():
    found = evaluate(mass_titre())
    concentration = found["concentration"]
    assert concentration["value"] == pytest.approx(5.0, rel=1e-12)
    assert concentration["unit"] == "mg/mL"
    assert concentration["reported"].endswith("mg/mL (k = 2.0)")
    assert found["factor"] == pytest.approx(1.0)
    # mg: standard 1500 g/g · 0.00001, drift 5 min · 0.002; in 3.020 mL, at 20 °C exactly
    u = (0.015**2 + 0.010**2) ** 0.5 / 3.020
    assert concentration["u"] == pytest.approx(u, rel=1e-6)
    row = found["replicates"][0]
    assert row["amount_mg"] == pytest.approx(15.1)
    assert row["amount_mmol"] is None
    assert budget(found)["drift"]["contribution"] == pytest.approx(0.010 / 3.020, rel=1e-6)


def test_mass_titre_drift_left_out_is_too_low_and_asks_to_look():
    record = mass_titre()
    del record["drift"], record["replicates"][0]["minutes"]
    found = evaluate(record)
    assert found["concentration"]["value"] == pytest.approx(15.0 / 3.020, rel=1e-12)
    assert finding(found, "drift")["verdict"] == "look"


def test_mass_titre_drift_that_decides_u_asks_to_look():
    record = mass_titre()
    record["drift"]["rate"]["u"] = "8"
    assert finding(evaluate(record), "drift")["verdict"] == "look"
    assert finding(evaluate(mass_titre()), "drift")["verdict"] == "holds"


def test_mass_titre_with_waters_expansion_asks_to_look_at_the_temperature():
    record = mass_titre()
    record["titrant"]["medium"] = "water"
    del record["liquid_expansion"]
    record["temperature"] = {"value": "23.0", "unit": "Cel"}
    found = finding(evaluate(record), "temperature")
    assert found["verdict"] == "look"
    assert "Water's expansion" in found["says"]


def test_excluded_replicate_without_minutes_leaves_the_rest_standing():
    record = mass_titre()
    unfinished = {"mass": "1.4", "burette": [["0.000", "2.8"]], "excluded": "clock forgotten"}
    record["replicates"].append(unfinished)
    found = evaluate(record)
    assert found["replicates"][1]["value"] is None
    assert found["concentration"]["value"] == pytest.approx(5.0, rel=1e-12)


def test_mass_titre_speaks_of_its_unit_everywhere():
    record = mass_titre()
    record["replicates"] += [dict(record["replicates"][0]), dict(record["replicates"][0])]
    record["replicates"][2]["excluded"] = "stopper left open"
    record["repeatability"] = {"relative_u": "0.001"}
    text = json.dumps(evaluate(record, trials=20_000))
    assert "mg/mL" in text
    assert "mol/L" not in text


@pytest.mark.parametrize("name", sorted(RECORDS))
def test_monte_carlo_of_new_routes_agrees_with_first_order(name):
    record = RECORDS[name]()
    # four degrees of freedom are drawn from the scaled t, whose variance is twice as large
    record.get("blank", {}).pop("dof", None)
    found = evaluate(record, trials=100_000, seed=3)
    first, drawn = found["concentration"], found["monte_carlo"]
    assert drawn["value"] == pytest.approx(first["value"], abs=0.02 * first["u"])
    assert drawn["u"] == pytest.approx(first["u"], rel=0.02)


@pytest.mark.parametrize("name", sorted(RECORDS))
def test_snapshot_of_new_routes_replays_to_the_same_numbers(name):
    record = RECORDS[name]()
    snapshot = make_snapshot(record, None, evaluate(record))
    again = replay(snapshot.text, expected_digest=snapshot.digest)
    assert again.agrees, again.says
    assert again.shift_over_u == 0.0


# path of the change, what is put there (None: taken out), path that is refused
ODD = [
    ("to standard", "back", None, "back"),
    ("to standard", "back.excess_to", "flask", "back.excess_to"),
    ("to standard", "back.surplus", "1", "back.surplus"),
    ("to standard", "back.ratio", "0", "back.ratio"),
    ("to standard", "back.added", {"substance": "HCl"}, "back.added"),
    ("to standard", "standard", None, "standard"),
    ("to standard", "reference", None, "reference"),
    ("to standard", "reference.substance", "KMnO4", "back.ratio"),
    ("to standard", "pipette", None, "pipette"),
    ("to standard", "blank", {"value": "1", "unit": "mL", "kind": "zero"}, "blank.kind"),
    ("to standard", "drift", {"rate": {"value": "1", "unit": "ug/min"}}, "drift"),
    ("to standard", "titre_of", "H2O", "titre_of"),
    ("to standard", "route", "weighed", "back"),
    ("to standard", "replicates.0.mass", None, "replicates[0].mass"),
    ("to standard", "replicates.0.minutes", "2", "replicates[0].minutes"),
    ("to unknown", "back.added", None, "back.added"),
    ("to unknown", "back.added.delivery", None, "back.added.delivery"),
    ("to unknown", "back.added.concentration", None, "back.added.concentration"),
    ("to unknown", "back.added.volume", "25", "back.added.volume"),
    ("to unknown", "back.added.temperature", "77", "back.added.temperature"),
    ("to unknown", "back.added.delivery.unit", "L", "back.added.delivery.unit"),
    (
        "to unknown",
        "back.added.components",
        [{"id": "B-3", "relative": "0.5"}],
        "back.added.components",
    ),
    ("to unknown", "blank", {"value": "25", "unit": "mL", "kind": "zero"}, "back.added"),
    ("to unknown", "replicates.0.burette", [["0.00", "25.00"]], "replicates[0].burette"),
    ("zero by blank", "excess", {"value": "0.02", "unit": "mL"}, "excess"),
    ("zero by blank", "blank.kind", "indicator", "back.added"),
    ("zero by blank", "blank.kind", "nought", "blank.kind"),
    ("zero by blank", "back.added", None, "ratio"),
    ("mass titre", "titre_of", None, "titre_of"),
    ("mass titre", "titrant.nominal.unit", "mol/L", "titrant.nominal.unit"),
    ("mass titre", "ratio", "1", "ratio"),
    ("mass titre", "liquid_expansion", None, "liquid_expansion"),
    ("mass titre", "standard", None, "standard"),
    ("mass titre", "drift.rate", None, "drift.rate"),
    ("mass titre", "drift.rate.unit", "mg/min", "drift.rate.unit"),
    ("mass titre", "drift.rate.value", "-1", "drift.rate.value"),
    ("mass titre", "drift.minutes", "5", "drift.minutes"),
    ("mass titre", "drift.timing", {"value": "1", "unit": "min"}, "drift.timing.value"),
    ("mass titre", "replicates.0.minutes", None, "replicates[0].minutes"),
    ("mass titre", "replicates.0.minutes", "-5", "replicates[0].minutes"),
    ("mass titre", "replicates.0.minutes", 5, "replicates[0].minutes"),
    ("mass titre", "blank", {"value": "0", "unit": "mL", "kind": "zero"}, "blank.kind"),
]


@pytest.mark.parametrize(("name", "where", "what", "path"), ODD)
def test_odd_record_of_new_routes_is_refused_by_its_path(name, where, what, path):
    record = RECORDS[name]()
    *way, last = where.split(".")
    held = record
    for key in way:
        held = held[int(key)] if isinstance(held, list) else held[key]
    if what is None:
        del held[last]
    else:
        held[last] = what
    with pytest.raises(RecordProblem) as refused:
        evaluate(record)
    assert refused.value.path == path
    assert refused.value.says


def test_figures_that_no_number_holds_are_refused_in_words():
    record = to_standard()
    record["standard"]["molar_mass"]["value"] = "1e-300"
    with pytest.raises(RecordProblem, match="so large or so small"):
        evaluate(record)


def test_weighed_record_keeps_its_snapshot_free_of_the_new_routes():
    record = to_standard()
    for key in ("back", "reference", "pipette"):
        del record[key]
    record["route"] = "weighed"
    held = json.loads(make_snapshot(record, None, evaluate(record)).text)
    assert "back_ratio" not in held["constants"]
    assert "amount_mg" not in held["result"]["replicates"][0]
