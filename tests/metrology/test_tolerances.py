"""Permissible errors of ware against rows of the standards."""

from decimal import Decimal

import pytest

from server.metrology.conformity import judge
from server.metrology.tolerances import NoTolerance, tables, tolerance

# ISO 385:2005, ISO 648:2008, ISO 1042:1998, ISO 8655-2:2002 (checked against a copy);
# ISO 8655-3:2002 from memory
ROWS = [
    ("burette", "25", "A", "0.05", "0.03", None),
    ("burette", "25", "B", "0.1", "0.1", None),
    ("burette", "10", "AS", "0.02", "0.02", None),
    ("burette", "50", "A", None, "0.05", None),
    ("pipette", "10", "A", None, "0.02", None),
    ("pipette", "25", "B", None, "0.06", None),
    ("flask", "1000", "A", None, "0.4", None),
    ("flask", "250", "B", None, "0.3", None),
    ("piston pipette", "1", None, None, "0.008", "0.003"),
    ("piston pipette", "0.1", None, None, "0.0008", "0.0003"),
    ("piston burette", "20", None, None, "0.04", "0.02"),
]


@pytest.mark.parametrize(("kind", "nominal", "grade", "division", "systematic", "random"), ROWS)
def test_tolerance_is_the_row_of_the_standard(kind, nominal, grade, division, systematic, random):
    found = tolerance(
        kind, Decimal(nominal), grade=grade, division_mL=division and Decimal(division)
    )
    assert (found.systematic_mL, found.random_mL) == (systematic, random)
    assert found.standard.startswith("ISO ")
    assert found.provenance
    limit = float(systematic)
    step = 1e-6
    assert judge(limit - step, limit).verdict == "holds"
    assert judge(limit, limit).verdict == "holds"
    assert judge(limit + step, limit).verdict == "fails"


def test_tolerance_of_a_piston_between_rows_is_the_larger_row():
    found = tolerance("piston pipette", Decimal("0.3"))
    assert (found.row_mL, found.systematic_mL) == ("0.5", "0.004")


@pytest.mark.parametrize(
    ("kind", "nominal", "grade", "division", "about", "says"),
    [
        ("burette", "25", "A", None, "division", "0.05 and 0.1 mL"),
        ("burette", "25", "A", "0.02", "division", "not of 0.02"),
        ("pipette", "15", "A", None, "nominal", "it has 0.5, 1, 2"),
        ("flask", "100", "AS", None, "class", "classes A, B"),
        ("pipette", "10", None, None, "class", "pick one"),
        ("piston pipette", "20", None, None, "nominal", "no piston pipette of 20"),
        ("beaker", "20", None, None, "kind", "has no table"),
    ],
)
def test_tolerance_nobody_knows_is_refused_in_words(kind, nominal, grade, division, about, says):
    with pytest.raises(NoTolerance, match=says) as caught:
        tolerance(kind, Decimal(nominal), grade=grade, division_mL=division and Decimal(division))
    assert caught.value.about == about


def test_tables_state_where_each_row_is_from():
    for table in tables().values():
        assert table["standard"]
        assert table["provenance"]
        assert table["rows"]
        for row in table["rows"]:
            numbers = [value for value in row.values() if value is not None]
            assert all(Decimal(one) > 0 for one in numbers)
