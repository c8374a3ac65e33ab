"""What stands beside a value: U with k, or the Monte Carlo interval where that is the statement."""

from typing import Any

import pytest

from server.sheets.parts.outcome import printed


def result(reported: str) -> dict[str, Any]:
    """A bench result of 0.10119 mol/L, as far as it is printed."""
    concentration = {
        "value": 0.1011888, "u": 5.3016e-5, "U": 1.0798e-4, "k": 2.036724, "dof": 32.1,
        "coverage": 0.95, "unit": "mol/L", "temperature_C": 20, "reported": reported,
    }  # fmt: skip
    return {"concentration": concentration, "factor": 1.011888}


@pytest.mark.parametrize(
    ("reported", "beside", "coverage"),
    [
        ("0.10119 ± 0.00011 mol/L (k = 2.04)", "± 0.00011 mol/L", "k = 2.04, 95 %"),
        (
            "0.10119 mol/L, 95 % interval 0.10107 to 0.10131 mol/L (Monte Carlo)",
            "0.10107 to 0.10131 mol/L",
            "interval of 95 % (Monte Carlo)",
        ),
    ],
)
def test_what_stands_beside_the_value_is_what_the_certificate_states(
    reported: str, beside: str, coverage: str
) -> None:
    shown = printed(result(reported))
    assert (shown.value, shown.beside, shown.coverage) == ("0.10119", beside, coverage)
    assert bool(shown.interval) is ("interval" in reported)
