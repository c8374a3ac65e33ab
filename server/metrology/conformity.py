"""Conformity with a tolerance by a named decision rule (ISO/IEC 17025, 7.8.6; JCGM 106)."""

from collections.abc import Mapping
from dataclasses import dataclass
from types import MappingProxyType
from typing import Literal

Verdict = Literal["holds", "look", "fails"]

SIMPLE = "simple acceptance"
GUARDED = "guard band w = U"
#: Decision rules by name, each in words.
RULES: Mapping[str, str] = MappingProxyType(
    {
        SIMPLE: "The figure within the limit holds, whatever its uncertainty (JCGM 106, 8.2).",
        GUARDED: (
            "The figure holds only where it lies within the limit less its expanded uncertainty U "
            "(JCGM 106, 8.3.2); within the limit but not so far it is looked at."
        ),
    }
)
#: A difference of two readings carries the binary fraction's last bits: they decide nothing.
_SLACK = 1e-9


@dataclass(frozen=True, slots=True)
class Conformity:
    """A figure against a limit, both in one unit; ``acceptance`` is the limit less guard band."""

    verdict: Verdict
    rule: str
    figure: float
    limit: float
    acceptance: float
    U: float | None


def judge(figure: float, limit: float, *, rule: str = SIMPLE, U: float | None = None) -> Conformity:
    """Return whether |figure| is within the limit, by the rule; the limit itself is within.

    Raises:
        ValueError: the rule is not known, or it needs U and there is none.
    """
    if rule not in RULES:
        says = f"“{rule}” is no decision rule; there are {', '.join(RULES)}."
        raise ValueError(says)
    if rule == GUARDED and U is None:
        says = f"The decision rule “{GUARDED}” needs the expanded uncertainty of the figure."
        raise ValueError(says)
    guard = U if rule == GUARDED and U is not None else 0.0
    acceptance, size = limit - guard, abs(figure)
    verdict: Verdict = "fails"
    if size <= acceptance + _SLACK * limit:
        verdict = "holds"
    elif size <= limit * (1.0 + _SLACK):
        verdict = "look"
    return Conformity(verdict, rule, figure, limit, acceptance, U)


def gravest(verdicts: list[Verdict]) -> Verdict:
    """Return the gravest of verdicts; *holds* where there is none."""
    for one in ("fails", "look"):
        if one in verdicts:
            return one
    return "holds"
