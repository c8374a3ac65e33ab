"""Whole records in, results out: against an independent calculation and against bad input."""

import copy
import json
from pathlib import Path

import pytest

from server.evaluation.bench_record import RecordProblem
from server.evaluation.entrance import evaluate, running_values

RECORDS = Path(__file__).parents[1] / "reference" / "records"
EXPECTED = json.loads((RECORDS / "expected.json").read_text(encoding="utf-8"))["records"]


def record(name="quam-a2"):
    return json.loads((RECORDS / f"{name}.json").read_text(encoding="utf-8"))


@pytest.mark.parametrize("name", sorted(EXPECTED))
def test_evaluate_agrees_with_an_independent_calculation(name):
    # first order (JCGM 100) by a calculation written apart from this program; QUAM:2012 A2 and A3
    # among them
    found, wanted = evaluate(record(name))["concentration"], EXPECTED[name]
    assert found["value"] == pytest.approx(wanted["c"], rel=5e-6)
    assert found["u"] == pytest.approx(wanted["u"], rel=0.005)
    assert found["k"] == pytest.approx(wanted["k"], abs=0.02)
    if wanted["dof"] is None:
        assert found["dof"] is None
    else:
        assert found["dof"] == pytest.approx(wanted["dof"], rel=0.01)


def test_evaluate_quam_a2_prints_the_published_result():
    found = evaluate(record())
    assert found["concentration"]["reported"] == "0.10214 ± 0.00020 mol/L (k = 2.0)"
    verdicts = {one["name"]: one["verdict"] for one in found["findings"]}
    assert verdicts["replicates"] == verdicts["burette use"] == "fails"
    assert sum(one["share_percent"] for one in found["budget"]) == pytest.approx(100.0)
    largest = max(found["budget"], key=lambda one: one["share_percent"])
    assert largest["contribution"] == pytest.approx(6.711e-5, rel=1e-3)  # QUAM A2: V_T calibration


def test_evaluate_same_record_and_seed_gives_the_same_document():
    one, other = (evaluate(record(), trials=20_000, seed=3) for _ in range(2))
    assert one == other
    assert one["monte_carlo"]["first_order_validated"] is True


def test_evaluate_one_digit_more_typed_changes_the_digest_and_nothing_else():
    changed = record()
    changed["replicates"][0]["delivered"] = "18.640"
    one, other = evaluate(record()), evaluate(changed)
    assert one["input_digest"] != other["input_digest"]
    assert one["concentration"] == other["concentration"]


def broken(path, value):
    """The QUAM A2 record with something else at a path; None takes the key away."""
    found = copy.deepcopy(record())
    *way, last = path
    held = found
    for key in way:
        held = held[key]
    if value is None:
        del held[last]
    else:
        held[last] = value
    return found


@pytest.mark.parametrize(
    ("path", "value", "named"),
    [
        (("format",), "bench-record/2", "format"),
        (("colour",), "pink", "colour"),
        (("route",), "guess", "route"),
        (("replicates",), [], "replicates"),
        (("replicates",), None, "replicates"),
        (("standard",), None, "standard"),
        (("standard", "mass_fraction", "value"), "99.98", "standard.mass_fraction.value"),
        (("standard", "mass_fraction", "value"), "0", "standard.mass_fraction.value"),
        (("titrant", "nominal", "unit"), "mol/m3", "titrant.nominal.unit"),
        (("titrant", "medium"), "ethanol", None),
        (("replicates", 0, "delivered"), "18,64", "replicates[0].delivered"),
        (("replicates", 0, "delivered"), 18.64, "replicates[0].delivered"),
        (("replicates", 0, "delivered"), "0", "replicates[0].delivered"),
        (("replicates", 0, "container_less_standard"), "60.5450", "replicates[0]"),
        (("replicates", 0, "excluded"), "spilled", "replicates"),
        (("balance", "buoyancy"), True, "air"),
        (("balance", "buoyancy"), "yes", "balance.buoyancy"),
        (("burette", "delivery", "value"), "0.02", "burette.delivery.value"),
        (("ratio",), "0/1", "ratio"),
        (("ratio",), "1e3", "ratio"),
        (("ratio",), "1/" + "9" * 400, "ratio"),
        (("replicates", 0, "label"), "\ud800", "(record)"),
        (("repeatability",), {"from": "replicates"}, "repeatability"),
        (("blank",), {"value": "20", "unit": "mL", "kind": "reagent"}, "replicates[0].burette"),
        (
            ("replicates", 0),
            {"mass": "0.3888", "curve": {"volume_mL": ["0", "1"], "pH": ["4", "5"]}},
            "replicates[0].curve",
        ),
        (("standard", "substance"), "unobtainium", None),
    ],
)
def test_evaluate_bad_record_is_refused_by_its_path(path, value, named):
    document = broken(path, value)
    if path == ("standard", "substance"):
        del document["standard"]["molar_mass"]
        del document["ratio"]
        named = "ratio"
    if path == ("titrant", "medium"):
        del document["liquid_expansion"]
        named = "liquid_expansion"
    with pytest.raises(RecordProblem) as refused:
        evaluate(document)
    assert refused.value.path.startswith(named)
    assert refused.value.says


def test_evaluate_reading_beyond_the_error_table_is_refused():
    document = broken(("replicates", 0), {"mass": "0.3888", "burette": [["0.00", "20.10"]]})
    document["burette"]["error_table"] = [["0", "0"], ["20", "0.01"]]
    with pytest.raises(RecordProblem, match="outside the burette's error table"):
        evaluate(document)


def test_running_values_of_an_unfinished_record_give_words_and_never_raise():
    document = record()
    document["replicates"] = [
        document["replicates"][0],
        {"label": "2", "container_and_standard": "60.1"},
        {"label": "3", "mass": "0.4", "delivered": "18.x"},
        "odd",
    ]
    found = running_values(document)
    assert found[0]["value"] == pytest.approx(0.102136, abs=1e-6)
    assert all(one["value"] is None and one["says"] for one in found[1:])


def test_evaluate_reference_with_components_cancels_in_the_flask_and_adds_in_the_burette():
    # measurement with one burette twice (GUM 5.2.2, r = 1): unknown in the burette the errors add,
    # 0.066 % twice is 0.132 %; in the flask they cancel
    shares = {}
    for where in ("burette", "flask"):
        document = {
            "format": "bench-record/1",
            "titrant": {"substance": "HCl", "nominal": {"value": "0.1", "unit": "mol/L"}},
            "route": "against-titrant",
            "ratio": "1",
            "unknown_in": where,
            "reference": {
                "substance": "NaOH",
                "concentration": {"value": "0.1", "unit": "mol/L", "u": "0.000066"},
                "components": [{"id": "B-1", "relative": "-0.00066"}],
            },
            "pipette": {"delivery": {"value": "20", "unit": "mL"}},
            "burette": {"delivery": {"unit": "mL", "u": "0.0132", "id": "B-1"}},
            "repeatability": {"relative_u": "0"},
            "replicates": [{"burette": [["0.00", "20.00"]]}],
        }
        found = evaluate(document)["concentration"]
        shares[where] = found["u"] / found["value"]
    assert shares["burette"] == pytest.approx(0.00132, rel=1e-6)
    assert shares["flask"] == pytest.approx(0.0, abs=1e-9)
