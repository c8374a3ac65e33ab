"""What a method of finding an equivalence point answers: a volume with its u, or why it cannot."""

from dataclasses import dataclass
from typing import Any, Literal

Method = Literal[
    "steepest segment",
    "first derivative",
    "second derivative",
    "gran acid side",
    "gran alkaline side",
    "model fit",
]
METHODS: tuple[Method, ...] = (
    "steepest segment",
    "first derivative",
    "second derivative",
    "gran acid side",
    "gran alkaline side",
    "model fit",
)


class CannotTell(ValueError):
    """A method has no answer for this curve; the words say why."""


@dataclass(frozen=True, slots=True)
class EndPoint:
    """An equivalence volume by one method, in mL, with its standard uncertainty.

    ``used`` are the indices of the points it rests on, ``says`` what is worth knowing beside the
    number.
    """

    method: Method
    volume_mL: float
    u_mL: float
    used: tuple[int, ...]
    says: str

    def to_document(self) -> dict[str, Any]:
        """Return the answer as a JSON-able document."""
        return {
            "method": self.method,
            "volume_mL": self.volume_mL,
            "u_mL": self.u_mL,
            "points_used": len(self.used),
            "indices_used": list(self.used),
            "says": self.says,
        }


@dataclass(frozen=True, slots=True)
class NoEndPoint:
    """A method without an answer, and why."""

    method: Method
    why: str

    def to_document(self) -> dict[str, Any]:
        """Return the answer as a JSON-able document."""
        return {"method": self.method, "unable": self.why}


Outcome = EndPoint | NoEndPoint
