import math

import pytest

from server.metrology.quantity import QuantityProblem, read_quantity


def read(document, unit="mL", **more):
    return read_quantity(document, "burette.delivery", unit=unit, **more)


@pytest.mark.parametrize(
    ("stated", "u"),
    [
        ({"u": "0.012"}, 0.012),
        ({"U": "0.024", "k": "2"}, 0.012),
        ({"half_width": "0.03", "shape": "rectangular"}, 0.03 / math.sqrt(3)),
        ({"half_width": "0.03", "shape": "triangular"}, 0.03 / math.sqrt(6)),
        ({"half_width": "0.03", "shape": "arcsine"}, 0.03 / math.sqrt(2)),
        ({}, 0.0),
    ],
)
def test_quantity_each_statement_gives_its_standard_uncertainty(stated, u):
    # divisors: JCGM 100, 4.3.7 and 4.3.9; JCGM 101, 6.4.6 for the arcsine distribution
    assert read({"value": "20.00", "unit": "mL", **stated}).u == pytest.approx(u, rel=1e-15)


@pytest.mark.parametrize(
    ("document", "path"),
    [
        ({"value": "20", "unit": "L"}, ".unit"),
        ({"value": "20"}, ".unit"),
        ({"unit": "mL"}, ".value"),
        ({"value": 20, "unit": "mL"}, ".value"),
        ({"value": "20", "unit": "mL", "u": "0.1", "U": "0.2", "k": "2"}, ".U"),
        ({"value": "20", "unit": "mL", "U": "0.2"}, ".k"),
        ({"value": "20", "unit": "mL", "U": "0.2", "k": "0"}, ".k"),
        ({"value": "20", "unit": "mL", "half_width": "0.2"}, ".shape"),
        ({"value": "20", "unit": "mL", "half_width": "0.2", "shape": "round"}, ".shape"),
        ({"value": "20", "unit": "mL", "u": "-0.2"}, ".u"),
        ({"value": "20", "unit": "mL", "u": "0.2", "dof": "0"}, ".dof"),
        ({"value": "20", "unit": "mL", "k": "2"}, ".k"),
        ({"value": "20", "unit": "mL", "sd": "2"}, ".sd"),
        ({"value": "nan", "unit": "mL"}, ".value"),
        ({"value": "20", "unit": "mL", "id": 7}, ".id"),
        ("20 mL", ""),
    ],
)
def test_quantity_what_cannot_be_is_refused_by_path(document, path):
    with pytest.raises(QuantityProblem) as refused:
        read(document)
    assert refused.value.path == f"burette.delivery{path}"
    assert refused.value.says


def test_quantity_bound_needs_no_value_and_pure_number_no_unit():
    assert read({"unit": "mL", "half_width": "0.03", "shape": "triangular"}, needs_value=False).u
    assert read({"value": "0.9998", "u": "0.0001"}, unit=None).value == 0.9998
