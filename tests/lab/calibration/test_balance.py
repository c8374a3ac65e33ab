"""A balance's calibration against plain arithmetic and GTC; its chart of check-weighings."""

import math

import pytest

from server.evaluation.entrance import evaluate
from server.lab.calibration.balance import judge_balance
from server.lab.calibration.check_weights import judge_check, judge_history, read_check_weight
from server.lab.papers import read_calibration
from server.lab.refusal import Unacceptable

#: Made up for this test. The balance reads too much by 0.4 mg at 100 g, 0.9 mg at 200 g.
DOCUMENT = {
    "step": "0.0001",
    "weights": [
        {"nominal": "50", "conventional": "50.00002", "U": "0.00010", "k": "2",
         "up": "50.0002", "down": "50.0003"},
        {"nominal": "100", "conventional": "100.00003", "U": "0.00016", "k": "2",
         "up": "100.0004", "down": "100.0005"},
        {"nominal": "200", "conventional": "199.99994", "U": "0.00030", "k": "2",
         "up": "200.0008", "down": "200.0008"},
    ],
    "repeatability": {
        "load": "100",
        "readings": ["100.0004", "100.0005", "100.0004", "100.0003", "100.0005",
                     "100.0004", "100.0006", "100.0004", "100.0005", "100.0004"],
    },
    "eccentricity": {
        "centre": "100.0004",
        "positions": ["100.0006", "100.0003", "100.0004", "100.0001"],
    },
}  # fmt: skip


def named(outcome, name):
    return next(one for one in outcome.checks if one.name == name)


def test_errors_of_indication_are_reading_less_weight_and_the_table_adds_the_opposite():
    outcome = judge_balance(DOCUMENT)
    errors = [one.error_g for one in outcome.found.errors]
    assert errors == pytest.approx([0.00023, 0.00042, 0.00086], abs=1e-9)
    table = outcome.document["error_table"]
    assert [float(row[1]) for row in table] == pytest.approx([0, -0.00023, -0.00042, -0.00086])
    assert [float(row[0]) for row in table] == pytest.approx([0, 50.00025, 100.00045, 200.0008])


def test_u_of_the_errors_agrees_with_gtc():
    import GTC

    outcome = judge_balance(DOCUMENT)
    readings = [float(one) for one in DOCUMENT["repeatability"]["readings"]]
    mean = sum(readings) / 10
    s = math.sqrt(sum((one - mean) ** 2 for one in readings) / 9)
    assert outcome.found.s_g == pytest.approx(s)
    for found, weight in zip(outcome.found.errors, DOCUMENT["weights"], strict=True):
        half_hysteresis = abs(float(weight["up"]) - float(weight["down"])) / 2
        mass = GTC.ureal(float(weight["conventional"]), float(weight["U"]) / 2)
        indication = (
            GTC.ureal((float(weight["up"]) + float(weight["down"])) / 2, s / math.sqrt(2), 9)
            + GTC.ureal(0, 0.0001 / math.sqrt(12))
            + GTC.ureal(0, 0.0001 / math.sqrt(12))
            + GTC.ureal(0, half_hysteresis / math.sqrt(3) or 0)
        )
        error = indication - mass
        assert found.error_g == pytest.approx(GTC.value(error), abs=1e-12)
        assert found.u_g == pytest.approx(GTC.uncertainty(error), rel=1e-9)
        assert found.dof == pytest.approx(GTC.dof(error), rel=1e-6)


def test_buoyancy_of_the_weights_counts_where_the_air_is_known():
    air = {"temperature": "20", "pressure": "900", "humidity": "40"}
    density = {"value": "7950", "unit": "kg/m3", "u": "70"}
    bare = judge_balance(DOCUMENT).found.errors[-1]
    found = judge_balance(DOCUMENT | {"air": air, "weights_density": density}).found.errors[-1]
    # air by OIML R 111-1, E.3-1 (from memory), relative u 2e-4; m·|ρa − 1.2|·u(ρ)/ρ² (OIML D 28)
    rho = (0.34848 * 900 - 0.009 * 40 * math.exp(0.061 * 20)) / 293.15
    extra = 199.99994 * abs(rho - 1.2) * 70 / 7950**2
    assert found.u_g**2 - bare.u_g**2 == pytest.approx(extra**2, rel=5e-3)


def test_calibration_is_what_papers_take_and_moves_a_mass():
    outcome = judge_balance(DOCUMENT)
    read = read_calibration("balance", outcome.document)
    # half a step, half the hysteresis, a quarter of the bend at 100 g
    assert float(read["linearity"]["half_width"]) == pytest.approx(
        0.00005 + 0.00005 + outcome.found.interpolation_g, abs=1e-8
    )
    record = {
        "format": "bench-record/1",
        "titrant": {"substance": "NaOH", "nominal": {"value": "0.1", "unit": "mol/L"}},
        "route": "weighed",
        "standard": {"substance": "KHP", "mass_fraction": {"value": "1.0", "u": "0.0003"}},
        "balance": {**read, "buoyancy": False},
        "burette": {"delivery": {"unit": "mL", "u": "0.01"}},
        "repeatability": {"relative_u": "0.0005"},
        "replicates": [
            {"container_and_standard": "100.00045", "container_less_standard": "50.00025",
             "delivered": "18.64"}
        ],
    }  # fmt: skip
    mass = evaluate(record)["replicates"][0]["mass_g"]
    assert mass == pytest.approx(100.00003 - 50.00002, abs=1e-9)


def test_minimum_mass_follows_usp_41():
    # USP <41>: 2000·max(s, 0.41 d); s = 0.084 mg here, 0.41 d = 0.041 mg
    outcome = judge_balance(DOCUMENT)
    assert float(outcome.minimum_g) == pytest.approx(2000 * outcome.found.s_g, abs=1e-6)
    same = {"readings": ["100.0004"] * 10}
    still = judge_balance(DOCUMENT | {"repeatability": same})
    assert float(still.minimum_g) == pytest.approx(2000 * 0.41 * 0.0001)


@pytest.mark.parametrize(
    ("limit", "verdict"), [("0.00087", "holds"), ("0.00086", "holds"), ("0.00085", "fails")]
)
def test_largest_error_is_judged_by_the_laboratory_limit(limit, verdict):
    outcome = judge_balance(DOCUMENT | {"limits": {"error": limit}})
    check = named(outcome, "error of indication")
    assert check.verdict == verdict
    assert check.rule == "simple acceptance"


def test_eccentricity_and_hysteresis_give_figures_and_verdicts():
    outcome = judge_balance(DOCUMENT | {"limits": {"eccentricity": "0.0002"}})
    check = named(outcome, "eccentricity")
    assert check.figure == pytest.approx(0.0003)
    assert check.verdict == "fails"
    assert named(outcome, "hysteresis").figure == pytest.approx(0.0001)
    without = {key: value for key, value in DOCUMENT.items() if key != "eccentricity"}
    assert named(judge_balance(without), "eccentricity").verdict == "look"


def test_five_readings_are_taken_and_four_are_not():
    five = {"readings": DOCUMENT["repeatability"]["readings"][:5]}
    outcome = judge_balance(DOCUMENT | {"repeatability": five})
    assert named(outcome, "repeatability").verdict == "look"
    with pytest.raises(Unacceptable, match="5 to 100"):
        judge_balance(DOCUMENT | {"repeatability": {"readings": ["100.0001"] * 4}})


@pytest.mark.parametrize(
    ("change", "field", "says"),
    [
        ({"step": ""}, "step", "missing"),
        ({"weights": []}, "weights", "1 to 60"),
        ({"weights": [{"conventional": "100", "up": "100"}]}, "weights[0].u", "states U and k"),
        ({"weights": [{"nominal": "100", "conventional": "50", "u": "0.0001", "up": "100"}]},
         "weights[0].conventional", "more than 1 %"),
        ({"weights": [DOCUMENT["weights"][1], DOCUMENT["weights"][0]]}, "weights[1].up", "rise"),
        ({"weights": [{**DOCUMENT["weights"][0], "mpe": "1"}]}, "weights[0].mpe", "not known"),
        ({"limits": {"error": "-1"}}, "limits.error", "at least 0"),
        ({"eccentricity": {"centre": "100", "positions": ["100"]}}, "eccentricity.positions",
         "2 to 8"),
    ],
)  # fmt: skip
def test_calibration_that_cannot_be_is_refused_by_its_place(change, field, says):
    with pytest.raises(Unacceptable, match=says) as caught:
        judge_balance(DOCUMENT | change)
    assert caught.value.field == field


CHART = {"name": "100 g, W-3", "centre": "100.0000", "warning": "0.0002", "action": "0.0003"}


@pytest.mark.parametrize(
    ("reading", "verdict"),
    [("100.0000", "holds"), ("100.0002", "holds"), ("99.9998", "holds"), ("100.0003", "look"),
     ("99.9997", "look"), ("100.0004", "fails"), ("99.9996", "fails")],
)  # fmt: skip
def test_check_weighing_at_its_limits(reading, verdict):
    assert judge_check(read_check_weight(CHART), reading).verdict == verdict


def test_second_of_three_beyond_warning_on_one_side_fails():
    chart = read_check_weight(CHART)
    readings = ["100.0003", "100.0000", "100.0003", "99.9997"]
    assert [one.verdict for one in judge_history(chart, readings)] == [
        "look", "holds", "fails", "look",
    ]  # fmt: skip


def test_chart_from_first_readings_is_two_and_three_s_but_no_less_than_a_step():
    first = ["100.0001", "100.0003", "99.9999", "100.0002", "100.0000"]
    chart = read_check_weight({"name": "W", "step": "0.0001", "first": first})
    s = math.sqrt(2.5) * 1e-4  # readings 1, 3, -1, 2, 0 in 0.1 mg: mean 1, Σd² = 10, ν = 4
    assert float(chart.centre) == pytest.approx(100.0001)
    assert float(chart.warning) == pytest.approx(2 * s, abs=1e-9)
    assert float(chart.action) == pytest.approx(3 * s, abs=1e-9)
    still = read_check_weight({"name": "W", "step": "0.0001", "first": ["100.0001"] * 5})
    assert (float(still.warning), float(still.action)) == (0.0001, 0.0001)
    assert judge_check(still, "100.0002").verdict == "holds"
    assert judge_check(still, "100.0003").verdict == "fails"


@pytest.mark.parametrize(
    ("change", "says"),
    [({"action": "0.0001"}, "not be less"), ({"warning": "0"}, "above zero"),
     ({"first": ["100"] * 3, "step": "0.0001"}, "5 to 200"), ({"first": ["100"] * 5}, "step")],
)  # fmt: skip
def test_chart_that_cannot_be_is_refused(change, says):
    with pytest.raises(Unacceptable, match=says):
        read_check_weight(CHART | change)
