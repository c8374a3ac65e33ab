"""Probes in buffers and thermometers beside a reference, as typed."""

from decimal import Decimal

import pytest

from server.evaluation.circumstances import Limits
from server.lab.calibration.probe import OFFSET_MV, SLOPE_PERCENT, judge_probe
from server.lab.calibration.thermometer import corrected_temperature, judge_thermometer
from server.lab.papers import read_calibration
from server.lab.refusal import Unacceptable

K25 = 59.15935  # mV, R T ln 10 / F at 25 °C


def probe(slope, offset, **changed):
    """Return a probe's document with readings in phthalate 4.01 and borate 9.18 at 25 °C."""
    buffers = [
        {"buffer": name, "temperature": "25.0", "mV": f"{offset - slope * K25 * (pH - 7):.4f}"}
        for name, pH in (("phthalate", 4.01), ("borate", 9.18))
    ]
    return {"set": "JIS Z 8802:2011", "buffers": buffers} | changed


def named(outcome, name):
    return next(one for one in outcome.checks if one.name == name)


@pytest.mark.parametrize(
    ("slope", "verdict"),
    [(0.93, "fails"), (0.9499, "fails"), (0.9501, "holds"), (0.98, "holds"), (1.0199, "holds"),
     (1.0201, "fails")],
)  # fmt: skip
def test_slope_is_judged_from_95_to_102_percent(slope, verdict):
    check = named(judge_probe(probe(slope, 4.0)), "probe slope")
    assert check.verdict == verdict
    assert check.figure == pytest.approx(100 * slope, abs=1e-3)
    assert check.rule == "simple acceptance"


@pytest.mark.parametrize(
    ("offset", "verdict"), [(29.9, "holds"), (-29.9, "holds"), (30.1, "fails"), (-30.1, "fails")]
)
def test_offset_is_judged_at_30_mV(offset, verdict):
    assert named(judge_probe(probe(0.99, offset)), "probe offset").verdict == verdict


def test_limits_are_those_of_a_standardization_finding():
    defaults = Limits()
    assert (defaults.slope_least_percent, defaults.slope_most_percent) == SLOPE_PERCENT
    assert defaults.offset_most_mV == OFFSET_MV


def test_laboratory_may_set_its_own_limits():
    outcome = judge_probe(probe(0.96, 4.0, limits={"slope_least": "97"}))
    assert outcome.verdict == "fails"
    assert named(outcome, "probe slope").basis == "limit set by the laboratory"


def test_own_certificate_of_a_buffer_goes_before_the_table():
    document = probe(0.98, 0.0)
    document["buffers"][0] |= {"certified_pH": "4.005", "u_pH": "0.003"}
    outcome = judge_probe(document)
    assert outcome.rows[0].pH == 4.005
    assert outcome.rows[0].u_pH == 0.003
    assert outcome.rows[1].source == "JIS Z 8802:2011"
    assert float(outcome.document["u_slope_percent"]) > 0


@pytest.mark.parametrize(
    ("change", "field", "says"),
    [
        ({"set": "mine"}, "set", "There is no set"),
        ({"buffers": [{"buffer": "phthalate", "temperature": "25", "mV": "177"}]}, "buffers",
         "2 to 12"),
        ({"buffers": [{"buffer": "milk", "temperature": "25", "mV": "177"}] * 2},
         "buffers[0].buffer", "no buffer"),
        ({"buffers": [{"buffer": "phthalate", "temperature": "25"}] * 2}, "buffers[0].mV",
         "one of them"),
        ({"buffers": [{"buffer": "phthalate", "temperature": "60", "mV": "177"}] * 2},
         "buffers[0].temperature", "from 0 to 50"),
        ({"buffers": [{"buffer": "phthalate", "temperature": "25", "mV": "177"}] * 2},
         "buffers", "too close"),
        ({"limits": {"slope_least": "103"}}, "limits.slope_most", "above"),
    ],
)  # fmt: skip
def test_probe_that_cannot_be_judged_is_refused(change, field, says):
    with pytest.raises(Unacceptable, match=says) as caught:
        judge_probe(probe(0.98, 0.0) | change)
    assert caught.value.field == field


THERMOMETER = {
    "step": "0.1",
    "reference_u": {"unit": "Cel", "U": "0.04", "k": "2"},
    "points": [
        {"reading": "10.1", "reference": "10.00"}, {"reading": "20.1", "reference": "20.03"},
        {"reading": "30.0", "reference": "30.02"},
    ],
}  # fmt: skip


def test_thermometer_table_holds_what_is_added_to_a_reading():
    outcome = judge_thermometer(THERMOMETER)
    assert outcome.error_table == (("10.1", "-0.10"), ("20.1", "-0.07"), ("30.0", "0.02"))
    assert corrected_temperature(outcome.error_table, Decimal("20.1")) == pytest.approx(20.03)
    assert corrected_temperature(outcome.error_table, Decimal("15.1")) == pytest.approx(15.015)
    bend = abs(-0.07 - (-0.10 + 0.12 * 10 / 19.9)) / 4
    assert outcome.u_C == pytest.approx((0.02**2 + 0.1**2 / 12 + bend**2 / 3) ** 0.5)
    assert read_calibration("thermometer", outcome.document)
    plain = read_calibration("thermometer", outcome.uncorrected)
    assert float(plain["reading"]["half_width"]) == pytest.approx(0.10 + 2 * outcome.u_C)
    with pytest.raises(Unacceptable, match="outside"):
        corrected_temperature(outcome.error_table, Decimal("30.1"))


@pytest.mark.parametrize(("limit", "verdict"), [("0.10", "holds"), ("0.09", "fails")])
def test_thermometer_is_judged_by_its_largest_error(limit, verdict):
    outcome = judge_thermometer(THERMOMETER | {"limits": {"error": limit}})
    assert outcome.verdict == verdict


@pytest.mark.parametrize(
    ("change", "field"),
    [({"reference_u": None}, "reference_u"), ({"points": THERMOMETER["points"][:1]}, "points"),
     ({"points": THERMOMETER["points"][::-1]}, "points[1].reading"), ({"step": "0"}, "step")],
)  # fmt: skip
def test_thermometer_that_cannot_be_is_refused(change, field):
    with pytest.raises(Unacceptable) as caught:
        judge_thermometer(THERMOMETER | change)
    assert caught.value.field == field
