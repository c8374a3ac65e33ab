"""Limits that a laboratory may set, and those that a recipe may set for itself."""

from collections.abc import Mapping
from dataclasses import dataclass
from types import MappingProxyType

from server.lab.refusal import Unacceptable
from server.metrology.decimal_text import DecimalProblem, read_wire_decimal

_MOST = 1_000_000


@dataclass(frozen=True, slots=True)
class LimitName:
    """What a limit is called on a page, its unit, and its default as text."""

    label: str
    unit: str
    default: str


LIMITS: Mapping[str, LimitName] = MappingProxyType(
    {
        "replicates_least": LimitName("Replicates, at least", "", "3"),
        "replicates_advised": LimitName("Replicates, advised", "", "6"),
        "spread_percent": LimitName("Relative standard deviation, at most", "%", "0.2"),
        "nominal_percent": LimitName("Distance from nominal, at most", "%", "10"),
        "burette_least_percent": LimitName("Use of the burette, at least", "%", "30"),
        "burette_most_percent": LimitName("Use of the burette, at most", "%", "90"),
        "resolution_multiple": LimitName("Reading over resolution, at least", "times", "1000"),
        "method_margin_percent": LimitName(
            "Difference between end-point methods that does not matter, at most", "%", "0.1"
        ),
    }
)


def check_limits(limits: Mapping[str, str], path: str) -> None:
    """Refuse a limit that nobody knows or that is no positive number."""
    for name, text in limits.items():
        field = f"{path}.{name}"
        if name not in LIMITS:
            says = f"{field} is not known here; known are {', '.join(LIMITS)}."
            raise Unacceptable(says, field=field)
        example = LIMITS[name].default
        try:
            good = 0 < read_wire_decimal(text, field) < _MOST
        except DecimalProblem as problem:
            raise Unacceptable(problem.says, field=field, example=example) from problem
        if not good:
            says = f"{field} must be a positive number below {_MOST}."
            raise Unacceptable(says, field=field, example=example)
        if name.startswith("replicates") and not text.isdigit():
            raise Unacceptable(f"{field} must be a whole number.", field=field, example=example)
