"""Everything that was found in a curve, and the answer that leaves the room."""

from dataclasses import dataclass
from typing import Any

import numpy as np

from server.curves.findings import CurveFinding
from server.curves.fitting import Fitted
from server.curves.gran import GranLine
from server.curves.jumps import CleanCurve
from server.curves.outcome import EndPoint, Method, Outcome
from server.curves.points import TitrationCurve

FORMAT = "equivalence/1"


@dataclass(frozen=True, slots=True, eq=False)
class Analysis:
    """Everything that was found in a curve: for the answer, for drawing, for a second look.

    ``jump`` is the segment of ``clean`` at which the curve jumps last, ``other_step`` what the
    methods answer for an earlier one.
    """

    curve: TitrationCurve
    clean: CleanCurve
    jump: int
    outcomes: tuple[Outcome, ...]
    other_step: tuple[Outcome, ...]
    proposed: Method
    fitted: Fitted | None
    gran: tuple[GranLine, ...]
    findings: tuple[CurveFinding, ...]

    def outcome(self, method: Method) -> Outcome:
        """Return what one method answers."""
        return next(one for one in self.outcomes if one.method == method)

    def to_document(self) -> dict[str, Any]:
        """Return the answer in the ``equivalence/1`` shape."""
        document: dict[str, Any] = {
            "format": FORMAT,
            "points": self.curve.size,
            "kind": self.curve.kind,
            "direction": self.curve.direction,
            "methods": [one.to_document() for one in self.outcomes],
            "proposed": self.proposed,
            "fit": None if self.fitted is None else fit_document(self.fitted),
            "findings": [one.to_document() for one in self.findings],
        }
        if self.other_step:
            document["other_step"] = [one.to_document() for one in self.other_step]
        return document


def fit_document(fitted: Fitted) -> dict[str, Any]:
    """Return a fit's parameters, each with its u, as a JSON-able document."""
    fit, uncertainty = fitted.fit, fitted.uncertainty
    steps = [f"pK{step + 1}" for step in fit.balance.system.fitted_steps]
    off = fit.off_pH[fit.trust > 0.5]
    chemistry = fit.chemistry
    document: dict[str, Any] = {
        "effective_mL": fit.effective_mL,
        "u_fit_mL": uncertainty.fit_mL,
        "u_model_mL": uncertainty.model_mL,
        "u_parts_mL": dict(uncertainty.parts),
        "effective_mol_L": chemistry.c * (1 - chemistry.f),
        "probe_slope": fit.value("slope"),
        "u_probe_slope": fit.u("slope"),
        "probe_offset": fit.value("offset"),
        "u_probe_offset": fit.u("offset"),
        "pK": fit.value(steps[-1]),
        "u_pK": fit.u(steps[-1]),
        "pKs": {name: fit.value(name) for name in steps},
        "carbonate_fraction": None,
        "u_carbonate_fraction": None,
        "carbonate_mol_L": None,
        "residual_rms": float(np.sqrt(np.mean(off * off))),
        "reading_u": fit.reading_u,
        "volume_u_mL": fit.volume_u,
        "down_weighted": list(fitted.down_weighted),
        "lag_s": fitted.lag.lag_s,
        "rounds": fit.rounds,
    }
    if fit.balance.system.takes_up_carbonate:
        document |= {
            "carbonate_fraction": chemistry.f,
            "u_carbonate_fraction": fit.u("carbonate"),
            "carbonate_mol_L": chemistry.c * chemistry.f,
        }
    return document


def proposed_method(outcomes: dict[Method, Outcome], findings: list[CurveFinding]) -> Method:
    """Return the method to propose: the fit unless something of it fails, then a derivative."""
    order: list[Method] = ["first derivative", "second derivative", "steepest segment"]
    if all(one.verdict != "fails" for one in findings):
        order.insert(0, "model fit")
    return next(method for method in order if isinstance(outcomes[method], EndPoint))
