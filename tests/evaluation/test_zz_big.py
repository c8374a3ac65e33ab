"""Odd curves: whatever is written, the answer is a result or a refusal in words."""

import json

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from server.evaluation.bench_record import RecordProblem
from server.evaluation.entrance import evaluate, running_values

KHP = "khp-manual-burette"

plain = st.floats(-1, 40, allow_nan=False).map(lambda one: f"{one:.4f}")
odd = st.one_of(
    st.sampled_from(["", "x", "1,5", "1e3", "-0", "007.0", "9" * 60, None, True, [], {}, 10**400]),
    st.floats(),
    st.integers(),
    plain,
)


@st.composite
def curves(draw):
    """Mostly curves that can be read, of any shape; at times something odd in them."""
    size = draw(st.integers(4, 30))
    steps = draw(st.lists(st.floats(0, 3, allow_nan=False), min_size=size, max_size=size))
    volume, at = [], 0.0
    for step in steps:
        at += step
        volume.append(f"{at:.3f}")
    kind = draw(st.sampled_from(["pH", "mV"]))
    low, high = (-1, 15) if kind == "pH" else (-900, 900)
    reading = draw(
        st.lists(
            st.floats(low, high, allow_nan=False).map(lambda one: f"{one:.3f}"),
            min_size=size,
            max_size=size,
        )
    )
    if draw(st.booleans()):
        reading.sort(key=float, reverse=draw(st.booleans()))
    found = {"volume_mL": volume, kind: reading}
    if draw(st.booleans()):
        found["seconds"] = [f"{30 * i}" for i in range(size)]
    if draw(st.integers(0, 5)) == 0:
        key = draw(st.sampled_from(sorted(found)))
        found[key][draw(st.integers(0, size - 1))] = draw(odd)
    return found


def answer_to(record):
    try:
        return evaluate(record), None
    except RecordProblem as problem:
        return None, problem


@settings(max_examples=2500, deadline=None, suppress_health_check=list(HealthCheck))
@given(
    curve=curves(),
    method=st.sampled_from([None, "model fit", "gran acid side", "second derivative"]),
    excluded=st.booleans(),
    system=st.sampled_from([None, "none", "khp-naoh", "tris-hcl", "carbonate-hcl"]),
)
def test_odd_curve_gives_a_result_or_a_refusal(curve_records, curve, method, excluded, system):
    record = curve_records.record(KHP, replicates=2)
    if system is not None:
        record["end_point"]["system"] = system
    third = {"mass": "0.4254", "curve": curve}
    if method is not None:
        third["method"] = method
    if excluded:
        third["excluded"] = "knocked over"
    record["replicates"].append(third)
    found, problem = answer_to(record)
    if problem is not None:
        assert problem.says
        assert problem.path
    else:
        # JSON has no NaN and no infinity
        json.dumps(found, allow_nan=False)
        assert found["concentration"]["u"] > 0
    running = running_values(record)
    assert running[2]["value"] is not None or running[2]["says"]


@pytest.mark.parametrize("key", ["curve", "end_point"])
@settings(max_examples=200, deadline=None, suppress_health_check=list(HealthCheck))
@given(value=st.recursive(odd, lambda one: st.lists(one) | st.dictionaries(st.text(), one)))
def test_anything_at_all_in_place_of_a_curve_is_refused_in_words(curve_records, key, value):
    record = curve_records.record(KHP)
    held = record["replicates"][0] if key == "curve" else record
    held[key] = value
    found, problem = answer_to(record)
    assert found is not None or problem.says
