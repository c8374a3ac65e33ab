"""From a curve and its circumstances to a model fit with its lag and its uncertainty."""

from dataclasses import dataclass, replace

import numpy as np

from server.chemistry.electrode import nernst_slope_mV
from server.curves.circumstances import Circumstances
from server.curves.jumps import CleanCurve
from server.curves.model.charge_balance import ChargeBalance, Flask
from server.curves.model.fit import FitProblem, ModelFit, PIVOT_pH, fit_model
from server.curves.model.lag_look import LagLook, look_for_lag
from server.curves.model.scatter import Given
from server.curves.model.systems import AcidBaseSystem
from server.curves.model.uncertainty import EndPointUncertainty, end_point_uncertainty
from server.curves.outcome import CannotTell, EndPoint, NoEndPoint, Outcome
from server.curves.points import Floats, TitrationCurve

_USUAL_STEPS_PER_SCATTER = 10
_FIRST_STEP_ABOVE_pH = 6.3
"""Between the two jumps of carbonate with acid (8.3 and about 4): pK1 of carbonic acid."""


@dataclass(frozen=True, slots=True, eq=False)
class Fitted:
    """A fit to go by, with its uncertainty and what was found of a lag."""

    fit: ModelFit
    uncertainty: EndPointUncertainty
    lag: LagLook

    @property
    def down_weighted(self) -> tuple[int, ...]:
        """The indices of the points that were given less than their full weight."""
        return tuple(int(at) for at in np.flatnonzero(self.fit.trust < 0.99))

    @property
    def used(self) -> tuple[int, ...]:
        """The indices of the points that count."""
        return tuple(int(at) for at in np.flatnonzero(self.fit.trust > 0.5))

    def end_point(self) -> EndPoint:
        """Return the effective equivalence volume as a method's answer."""
        system, uncertainty, lag = self.fit.balance.system, self.uncertainty, self.lag
        says = (
            f"All {len(self.used)} points against the charge balance of {system.says}; u is "
            f"{1000 * uncertainty.fit_mL:.1f} µL from the scatter and "
            f"{1000 * uncertainty.model_mL:.1f} µL from the model."
        )
        if system.takes_up_carbonate:
            says += " Effective volume: carbonate of the titrant counted to hydrogencarbonate."
        if lag.lag_s is not None:
            says += f" A lag of {lag.lag_s:.2f} s was taken out."
        return EndPoint("model fit", self.fit.effective_mL, uncertainty.u_mL, self.used, says)

    def inner_end_point(self, share: float) -> EndPoint:
        """Return an earlier equivalence point that lies at a fixed share of the last."""
        says = f"By the model at {share:g} of the last equivalence point."
        u = share * self.uncertainty.u_mL
        return EndPoint("model fit", share * self.fit.effective_mL, u, self.used, says)


def in_pH(curve: TitrationCurve, known: Circumstances) -> Floats:
    """Return readings as pH; mV by the ideal slope about pH 7, the probe's own left to the fit."""
    if curve.kind == "pH":
        return curve.y
    return np.asarray(PIVOT_pH - curve.y / nernst_slope_mV(known.temperature_C))


def fitted(
    curve: TitrationCurve, clean: CleanCurve, known: Circumstances, *, near_mL: float
) -> Fitted:
    """Return the model fit of a curve that jumps near a volume.

    Raises:
        CannotTell: something that the model needs is not known, or the curve goes the other way.
        FitProblem: the fit does not settle.
    """
    system, flask = _needed(known)
    pH = in_pH(curve, known)
    if (pH[-1] > pH[0]) != (system.direction == "rising"):
        goes = "rises" if pH[-1] > pH[0] else "falls"
        says = f"The curve {goes}; that of {system.says} does not. Is it the right system?"
        raise CannotTell(says)
    with np.errstate(all="ignore"):
        # what overflows in a fit that goes astray shows in its end, which is looked at
        found = _fitted(curve, clean, known, near_mL=near_mL, balance=ChargeBalance(system, flask))
    if not np.isfinite(found.uncertainty.u_mL) or found.uncertainty.u_mL <= 0:
        raise FitProblem("The points do not determine the model's parameters.")
    return found


def _fitted(
    curve: TitrationCurve,
    clean: CleanCurve,
    known: Circumstances,
    *,
    near_mL: float,
    balance: ChargeBalance,
) -> Fitted:
    pH = in_pH(curve, known)
    given = _given(curve, clean, known)
    try:
        fit = fit_model(balance, curve.V, pH, start_mL=near_mL, given=given)
        lag = look_for_lag(
            fit, curve.V, pH, seconds=curve.seconds, thrown_off=clean.bubbles, given=given
        )
        others = (("lag of the probe", lag.part_mL),) if lag.part_mL else ()
        return Fitted(lag.fit, end_point_uncertainty(lag.fit, others=others), lag)
    except np.linalg.LinAlgError as problem:
        raise FitProblem("The points do not determine the model's parameters.") from problem


def _needed(known: Circumstances) -> tuple[AcidBaseSystem, Flask]:
    if known.system is None:
        raise CannotTell("No acid-base system was named for this curve, so there is no model.")
    missing = []
    if known.flask_volume_mL is None:
        missing.append("the volume in the flask")
    if known.amount_mmol is None:
        missing.append("the amount of standard")
    if known.flask_volume_mL is None or known.amount_mmol is None:
        raise CannotTell(f"The model fit needs {' and '.join(missing)}.")
    flask = Flask(known.flask_volume_mL, known.amount_mmol, known.temperature_C)
    return known.system, flask


def slowed(outcome: Outcome, lag: LagLook) -> Outcome:
    """Return what another method answers, its u widened by what a lag that was found can do to it.

    Slopes and lines are read off the points as they are, so that the whole lag is in them.
    """
    if isinstance(outcome, NoEndPoint) or not lag.shift_mL:
        return outcome
    u = float(np.hypot(outcome.u_mL, lag.shift_mL))
    says = f"{outcome.says} u allows {abs(lag.shift_mL):.3f} mL for the lag of the probe."
    return replace(outcome, u_mL=u, says=says)


def _given(curve: TitrationCurve, clean: CleanCurve, known: Circumstances) -> Given:
    """Return priors and scatter, the guesses where nothing is known taken from the points."""
    trust = None
    if clean.bubbles:
        trust = np.ones(curve.size)
        trust[list(clean.bubbles)] = 0.0
    per_pH = 1.0 if curve.kind == "pH" else float(nernst_slope_mV(known.temperature_C))
    later_step = float(np.median(np.diff(clean.V[clean.V.size // 2 :])))
    return replace(
        known.given(),
        reading_guess=min(max(clean.scatter / per_pH, 0.003), 0.03),
        volume_guess=min(0.002, later_step / _USUAL_STEPS_PER_SCATTER),
        trust=trust,
    )


def only_first_step(curve: TitrationCurve, known: Circumstances, at: int) -> bool:
    """Tell whether a jump behind a point is an earlier step of a system that has one."""
    system = known.system
    if system is None or system.inner_step is None:
        return False
    return bool(in_pH(curve, known)[at] > _FIRST_STEP_ABOVE_pH)
