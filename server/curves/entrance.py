"""The way into this room: a curve's points in, every method's equivalence volume out."""

from collections.abc import Callable
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from server.chemistry.equilibria import AIR_SATURATED_CO2_MMOL_PER_ML, TemperatureProblem
from server.curves import findings
from server.curves.charge_balance import ChargeBalance, Flask
from server.curves.derivatives import first_derivative, second_derivative, steepest_segment
from server.curves.findings import CurveFinding
from server.curves.fit_scatter import Given, Priors
from server.curves.fit_uncertainty import EndPointUncertainty, end_point_uncertainty
from server.curves.gran import GranLine, gran_line
from server.curves.jumps import CleanCurve, cleaned, jumps
from server.curves.model_fit import FitProblem, ModelFit, PIVOT_pH, fit_model
from server.curves.outcome import METHODS, CannotTell, EndPoint, Method, NoEndPoint, Outcome
from server.curves.points import CurveProblem, Floats, PointsLike, TitrationCurve, titration_curve
from server.curves.probe_lag import LagLook, look_for_lag
from server.curves.systems import SYSTEMS, AcidBaseSystem

FORMAT = "equivalence/1"
_MV_PER_pH_AND_K = 0.19842
"""R ln(10) / F in mV per pH and kelvin (CODATA)."""


@dataclass(frozen=True, slots=True, eq=False)
class Analysis:
    """Everything that was found in a curve: for the answer, for drawing, for a second look."""

    curve: TitrationCurve
    clean: CleanCurve
    outcomes: tuple[Outcome, ...]
    other_step: tuple[Outcome, ...]
    proposed: Method
    fit: ModelFit | None
    uncertainty: EndPointUncertainty | None
    lag: LagLook | None
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
            "fit": None if self.fit is None else self._fit_document(self.fit),
            "findings": [one.to_document() for one in self.findings],
        }
        if self.other_step:
            document["other_step"] = [one.to_document() for one in self.other_step]
        return document

    def _fit_document(self, fit: ModelFit) -> dict[str, Any]:
        uncertainty = self.uncertainty
        carbonate = "carbonate" in fit.names
        at = fit.names.index("carbonate") if carbonate else 0
        steps = fit.balance.system.fitted_steps
        return {
            "effective_mL": fit.effective_mL,
            "u_fit_mL": None if uncertainty is None else uncertainty.fit_mL,
            "u_model_mL": None if uncertainty is None else uncertainty.model_mL,
            "u_parts_mL": {} if uncertainty is None else dict(uncertainty.parts),
            "effective_mol_L": fit.chemistry.c * (1 - fit.chemistry.f),
            "probe_slope": fit.value("slope"),
            "u_probe_slope": float(fit.covariance[2, 2]) ** 0.5,
            "probe_offset": fit.value("offset"),
            "u_probe_offset": float(fit.covariance[1, 1]) ** 0.5,
            "pK": fit.value(f"pK{steps[-1] + 1}"),
            "pKs": {f"pK{step + 1}": fit.value(f"pK{step + 1}") for step in steps},
            "carbonate_fraction": fit.chemistry.f if carbonate else None,
            "u_carbonate_fraction": float(fit.covariance[at, at]) ** 0.5 if carbonate else None,
            "carbonate_mol_L": fit.chemistry.c * fit.chemistry.f if carbonate else None,
            "residual_rms": _rms(fit),
            "reading_u": fit.reading_u,
            "volume_u_mL": fit.volume_u,
            "down_weighted": _down_weighted(fit),
            "lag_s": None if self.lag is None else self.lag.lag_s,
            "rounds": fit.rounds,
        }


def _rms(fit: ModelFit) -> float:
    off = fit.off_pH[fit.trust > 0.5]
    return float(np.sqrt(np.mean(off * off)))


def _down_weighted(fit: ModelFit) -> list[int]:
    return [int(at) for at in np.flatnonzero(fit.trust < 0.99)]


def equivalence(
    points: PointsLike,
    *,
    system: str | None = None,
    flask_volume_mL: float | None = None,
    amount_mmol: float | None = None,
    temperature_C: float = 25.0,
) -> dict[str, Any]:
    """Return every method's equivalence volume as an ``equivalence/1`` document.

    Raises:
        CurveProblem: the points make no curve, or what was given beside them cannot be.
    """
    return analysed(
        points,
        system=system,
        flask_volume_mL=flask_volume_mL,
        amount_mmol=amount_mmol,
        temperature_C=temperature_C,
    ).to_document()


def analysed(  # noqa: PLR0913 - a curve's circumstances, all by name
    points: PointsLike,
    *,
    system: str | None = None,
    flask_volume_mL: float | None = None,
    amount_mmol: float | None = None,
    temperature_C: float = 25.0,
    given: Given | None = None,
) -> Analysis:
    """Return everything found in a curve; ``given`` are other priors or a known scatter.

    Raises:
        CurveProblem: the points make no curve, or what was given beside them cannot be.
    """
    known = _system(system)
    _positive("flask_volume_mL", flask_volume_mL)
    _positive("amount_mmol", amount_mmol)
    curve = titration_curve(points)
    clean = cleaned(curve)
    found = jumps(clean)
    main = found[-1]
    other = found[-2] if len(found) > 1 else None
    near = float(clean.V[main] + clean.V[main + 1]) / 2
    outcomes: dict[Method, Outcome] = {
        method: _asked(method, lambda: _by_slopes(method, clean, main)) for method in METHODS[:3]
    }
    gran, refused = _gran_lines(
        curve,
        clean,
        near=near,
        flask_volume_mL=flask_volume_mL,
        system=known,
        inner_mL=_inner(clean, other, known, near),
        temperature_C=temperature_C,
    )
    outcomes |= {line.end_point.method: line.end_point for line in gran}
    outcomes |= {one.method: one for one in refused}
    notes = [findings.of_bubbles(curve, clean.bubbles), findings.of_spacing(clean, main)]
    fit = uncertainty = lag = None
    try:
        fit, uncertainty, lag = _fitted(
            curve,
            clean,
            near=near,
            system=known,
            flask_volume_mL=flask_volume_mL,
            amount_mmol=amount_mmol,
            temperature_C=temperature_C,
            given=given,
        )
    except (CannotTell, FitProblem, TemperatureProblem) as problem:
        outcomes["model fit"] = NoEndPoint("model fit", str(problem))
    else:
        outcomes["model fit"] = _fit_end_point(curve, fit, uncertainty, lag)
        notes = [*_fit_findings(curve, fit, uncertainty, lag, outcomes), notes[1]]
    others: tuple[Outcome, ...] = ()
    if other is not None:
        others = tuple(
            _asked(method, lambda: _by_slopes(method, clean, other)) for method in METHODS[:3]
        )
        if fit is not None and known is not None and known.inner_step:
            others = (*others, _inner_end_point(fit, uncertainty, known.inner_step))
    return Analysis(
        curve=curve,
        clean=clean,
        outcomes=tuple(outcomes[method] for method in METHODS),
        other_step=others,
        proposed=_proposed(outcomes, notes),
        fit=fit,
        uncertainty=uncertainty,
        lag=lag,
        gran=tuple(gran),
        findings=tuple(notes),
    )


def _system(name: str | None) -> AcidBaseSystem | None:
    if name is None or name == "none":
        return None
    if name not in SYSTEMS:
        known = ", ".join([*SYSTEMS, "none"])
        raise CurveProblem(f"No system {name!r} is known; there are: {known}.")
    return SYSTEMS[name]


def _positive(name: str, value: float | None) -> None:
    if value is not None and not (np.isfinite(value) and value > 0):
        raise CurveProblem(f"{name} must be above zero, not {value:g}.")


def _asked(method: Method, work: Callable[[], EndPoint]) -> Outcome:
    try:
        return work()
    except CannotTell as problem:
        return NoEndPoint(method, str(problem))


def _by_slopes(method: Method, clean: CleanCurve, jump: int) -> EndPoint:
    ways: dict[str, Callable[[CleanCurve, int], EndPoint]] = {
        "steepest segment": steepest_segment,
        "first derivative": first_derivative,
        "second derivative": second_derivative,
    }
    return ways[method](clean, jump)


def _inner(
    clean: CleanCurve, other: int | None, system: AcidBaseSystem | None, near: float
) -> float | None:
    if system is not None:
        return None if system.inner_step is None else near * system.inner_step
    return None if other is None else float(clean.V[other] + clean.V[other + 1]) / 2


def _in_pH(curve: TitrationCurve, y: Floats, temperature_C: float) -> Floats:
    """Return readings as pH; mV by the ideal slope about pH 7, the probe's own left to the fit."""
    if curve.kind == "pH":
        return y
    return np.asarray(PIVOT_pH - y / (_MV_PER_pH_AND_K * (temperature_C + 273.15)))


def _gran_lines(  # noqa: PLR0913 - a curve's circumstances
    curve: TitrationCurve,
    clean: CleanCurve,
    *,
    near: float,
    flask_volume_mL: float | None,
    system: AcidBaseSystem | None,
    inner_mL: float | None,
    temperature_C: float,
) -> tuple[list[GranLine], list[NoEndPoint]]:
    """Return the lines that could be drawn and the sides that could not."""
    sides: tuple[Method, Method] = ("gran acid side", "gran alkaline side")
    if curve.kind == "mV" and system is None:
        why = (
            "The readings are in mV and the reaction is not known: Gran's functions need the "
            "electrode's slope and what the electrode answers to."
        )
        return [], [NoEndPoint(method, why) for method in sides]
    pH = _in_pH(curve, curve.y[list(clean.at)], temperature_C)
    before_first = sides if pH[-1] >= pH[0] else sides[::-1]
    lines: list[GranLine] = []
    refused: list[NoEndPoint] = []
    for method, side in zip(before_first, ("before", "beyond"), strict=True):
        try:
            lines.append(
                gran_line(
                    clean,
                    pH,
                    side=side,
                    near_mL=near,
                    flask_volume_mL=flask_volume_mL,
                    inner_mL=inner_mL,
                )
            )
        except CannotTell as problem:
            refused.append(NoEndPoint(method, str(problem)))
    return lines, refused


def _fitted(  # noqa: PLR0913 - a curve's circumstances
    curve: TitrationCurve,
    clean: CleanCurve,
    *,
    near: float,
    system: AcidBaseSystem | None,
    flask_volume_mL: float | None,
    amount_mmol: float | None,
    temperature_C: float,
    given: Given | None,
) -> tuple[ModelFit, EndPointUncertainty, LagLook]:
    if system is None:
        raise CannotTell("No acid-base system was named for this curve, so there is no model.")
    missing = [
        words
        for words, value in (
            ("the volume in the flask", flask_volume_mL),
            ("the amount of standard", amount_mmol),
        )
        if value is None
    ]
    if missing or flask_volume_mL is None or amount_mmol is None:
        raise CannotTell(f"The model fit needs {' and '.join(missing)}.")
    pH = _in_pH(curve, curve.y, temperature_C)
    if (pH[-1] > pH[0]) != (system.direction == "rising"):
        goes = "rises" if pH[-1] > pH[0] else "falls"
        says = f"The curve {goes}; that of {system.says} does not. Is it the right system?"
        raise CannotTell(says)
    balance = ChargeBalance(system, Flask(flask_volume_mL, amount_mmol, temperature_C))
    step = float(np.median(np.diff(clean.V[max(0, clean.V.size // 2) :])))
    trust = np.ones(curve.size)
    trust[list(clean.bubbles)] = 0.0
    scatter = clean.scatter if curve.kind == "pH" else clean.scatter / 59.16
    asked = given or Given(
        priors=Priors(
            u_flask_carbonate=AIR_SATURATED_CO2_MMOL_PER_ML * flask_volume_mL / 2,
        )
    )
    asked = replace(
        asked,
        reading_guess=min(max(scatter, 0.003), 0.03),
        volume_guess=min(0.002, step / 10),
        trust=trust if clean.bubbles else None,
    )
    fit = fit_model(balance, curve.V, pH, start_mL=near, given=asked)
    lag = look_for_lag(
        fit, curve.V, pH, seconds=curve.seconds, thrown_off=clean.bubbles, given=asked
    )
    others = (("lag of the probe", lag.part_mL),) if lag.part_mL else ()
    return lag.fit, end_point_uncertainty(lag.fit, others=others), lag


def _fit_end_point(
    curve: TitrationCurve, fit: ModelFit, uncertainty: EndPointUncertainty, lag: LagLook
) -> EndPoint:
    system = fit.balance.system
    used = tuple(int(at) for at in np.flatnonzero(fit.trust > 0.5))
    model = uncertainty.model_mL
    says = (
        f"All {len(used)} points against the charge balance of {system.says}; u is "
        f"{1000 * uncertainty.fit_mL:.1f} µL from the scatter and {1000 * model:.1f} µL from the "
        "model."
    )
    if system.takes_up_carbonate:
        says += " Effective volume: carbonate of the titrant counted to hydrogencarbonate."
    if lag.lag_s is not None:
        says += f" A lag of {lag.lag_s:.2f} s was taken out."
    del curve
    return EndPoint("model fit", fit.effective_mL, uncertainty.u_mL, used, says)


def _inner_end_point(
    fit: ModelFit, uncertainty: EndPointUncertainty | None, share: float
) -> EndPoint:
    u = share * (uncertainty.u_mL if uncertainty is not None else 0.0)
    used = tuple(int(at) for at in np.flatnonzero(fit.trust > 0.5))
    says = "By the model a fixed fraction of the last equivalence point."
    return EndPoint("model fit", share * fit.effective_mL, u, used, says)


def _fit_findings(
    curve: TitrationCurve,
    fit: ModelFit,
    uncertainty: EndPointUncertainty,
    lag: LagLook,
    outcomes: dict[Method, Outcome],
) -> list[CurveFinding]:
    made = [
        findings.of_bubbles(curve, tuple(_down_weighted(fit))),
        findings.of_residuals(fit, uncertainty),
        lag.finding,
        findings.of_probe(fit),
        findings.of_constants(fit),
        findings.of_carbonate(fit),
    ]
    fitted, derivative = outcomes["model fit"], outcomes["first derivative"]
    if isinstance(fitted, EndPoint) and isinstance(derivative, EndPoint):
        made.append(findings.of_agreement(fitted, derivative))
    return made


def _proposed(outcomes: dict[Method, Outcome], notes: list[CurveFinding]) -> Method:
    """Return the method to propose: the fit unless something of it fails, then the derivatives."""
    failing = any(one.verdict == "fails" for one in notes)
    order: list[Method] = ["first derivative", "second derivative", "steepest segment"]
    if not failing:
        order.insert(0, "model fit")
    return next(method for method in order if isinstance(outcomes[method], EndPoint))
