"""The outcome of a check of an instrument, ware, probe or standard lot."""

from collections.abc import Sequence
from dataclasses import asdict, dataclass
from typing import Any

from server.metrology.conformity import Conformity, Verdict, gravest


@dataclass(frozen=True, slots=True)
class Check:
    """One check in figures and in words; the keys are those of a finding of a bench result.

    ``rule`` names the decision rule where the check states conformity with a limit, and is empty
    where it does not.
    """

    name: str
    verdict: Verdict
    says: str
    basis: str
    rule: str = ""
    figure: float | None = None
    limit: float | None = None
    unit: str = ""
    figure_text: str = ""
    limit_text: str = ""

    def to_document(self) -> dict[str, Any]:
        """Return the check as a JSON-able document."""
        return asdict(self)


def conformity_check(
    name: str, found: Conformity, *, basis: str, unit: str, says: str, shown: tuple[str, str]
) -> Check:
    """Return a check that states conformity; ``shown`` is figure and limit as one says them."""
    return Check(
        name=name,
        verdict=found.verdict,
        says=says,
        basis=basis,
        rule=found.rule,
        figure=found.figure,
        limit=found.limit,
        unit=unit,
        figure_text=shown[0],
        limit_text=shown[1],
    )


def overall(checks: Sequence[Check]) -> Verdict:
    """Return the gravest verdict of several checks."""
    return gravest([one.verdict for one in checks])
