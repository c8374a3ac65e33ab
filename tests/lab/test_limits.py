import dataclasses

import pytest

from server.evaluation.circumstances import Limits
from server.lab.limits import LIMITS, check_limits
from server.lab.refusal import Unacceptable


def test_limits_every_name_and_default_is_that_of_the_evaluation():
    defaults = {one.name: one.default for one in dataclasses.fields(Limits)}
    for name, limit in LIMITS.items():
        assert float(limit.default) == float(defaults[name])


def test_limits_sensible_ones_pass():
    check_limits({"spread_percent": "0.15", "replicates_least": "4"}, "limits")


@pytest.mark.parametrize(
    ("name", "text"),
    [
        ("spread", "0.2"),
        ("spread_percent", "0"),
        ("spread_percent", "-0.2"),
        ("spread_percent", "0,2"),
        ("spread_percent", ""),
        ("spread_percent", "nan"),
        ("spread_percent", "1_0"),
        ("spread_percent", "٢"),
        ("spread_percent", "1e6"),
        ("replicates_least", "2.5"),
        ("replicates_least", "3e0"),
    ],
)
def test_limits_odd_one_is_refused_by_its_path(name, text):
    with pytest.raises(Unacceptable) as refused:
        check_limits({name: text}, "limits")
    assert refused.value.field == f"limits.{name}"
