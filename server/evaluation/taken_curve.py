"""What an evaluation keeps of a curve: its end point, and everything that was found in words."""

from collections.abc import Mapping
from dataclasses import asdict, dataclass
from typing import Any

_TAKES_UP_CARBONATE = "khp-naoh"


@dataclass(frozen=True, slots=True)
class CurveEndPoint:
    """An end point on a curve as the model of a standardization takes it, volumes in mL.

    ``holds_blank``: the method counts the carbonate of the flask's water, so that a blank of it
    is not taken off again.
    """

    method: str
    system: str
    u_shared_mL: float
    u_own_mL: float
    holds_blank: bool


@dataclass(frozen=True, slots=True)
class TakenCurve:
    """A curve as an evaluation took it; a snapshot holds the same, so that it can be repeated.

    ``index`` counts the record's replicates from 0, ``found`` is the ``equivalence/1`` document.
    ``flask_assumed``: nobody stated the volume in the flask, the fit took a usual one.
    """

    index: int
    label: str
    taken: str
    proposed: str
    stated: bool
    volume_mL: float
    u_shared_mL: float
    u_own_mL: float
    system: str
    flask_assumed: bool
    found: Mapping[str, Any]

    @property
    def holds_blank(self) -> bool:
        """Whether the end point is free of the carbonate of the flask's water."""
        return holds_blank(self.taken, self.system)

    def end_point(self) -> CurveEndPoint:
        """Return the end point for the model."""
        return CurveEndPoint(
            method=self.taken,
            system=self.system,
            u_shared_mL=self.u_shared_mL,
            u_own_mL=self.u_own_mL,
            holds_blank=self.holds_blank,
        )

    def to_document(self) -> dict[str, Any]:
        """Return the curve as a JSON-able document, for the snapshot."""
        return asdict(self)


def holds_blank(method: str, system: str) -> bool:
    """Tell whether a method's volume is free of the carbonate of the flask's water."""
    return method == "model fit" and system == _TAKES_UP_CARBONATE
