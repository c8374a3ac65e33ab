"""A finding: a check's outcome, which never blocks and never deletes."""

from collections.abc import Sequence
from dataclasses import asdict, dataclass
from typing import Any, Literal

Verdict = Literal["holds", "look", "fails"]


@dataclass(frozen=True, slots=True)
class Finding:
    """A check's outcome in figures and in words.

    ``figure`` and ``limit`` are numbers in ``unit`` where the check has any; ``figure_text`` and
    ``limit_text`` are the same as one would say them.
    """

    name: str
    verdict: Verdict
    says: str
    basis: str
    figure: float | None = None
    limit: float | None = None
    unit: str = ""
    figure_text: str = ""
    limit_text: str = ""

    def to_document(self) -> dict[str, Any]:
        """Return the finding as a JSON-able document."""
        return asdict(self)


def joined(words: Sequence[str]) -> str:
    """Return words as one would say them: ``a, b and c``."""
    if len(words) < 2:
        return "".join(words)
    return f"{', '.join(words[:-1])} and {words[-1]}"


def replicates_named(labels: Sequence[str]) -> str:
    """Return ``replicate 2`` or ``replicates 2 and 3``."""
    return f"replicate{'s' if len(labels) > 1 else ''} {joined(labels)}"
