"""What a curve and its fit show beside the number, in figures and in words."""

from dataclasses import asdict, dataclass
from typing import Any, Literal

import numpy as np

from server.curves.jumps import CleanCurve
from server.curves.model.fit import ModelFit
from server.curves.model.uncertainty import EndPointUncertainty, neighbours_correlation
from server.curves.outcome import EndPoint
from server.curves.points import TitrationCurve

_SETTING = "a laboratory setting"


@dataclass(frozen=True, slots=True)
class CurveFinding:
    """One thing looked at: ``holds``, ``look`` or ``fails``, with figure, limit and words."""

    name: str
    verdict: Literal["holds", "look", "fails"]
    says: str
    basis: str = _SETTING
    figure: float | None = None
    limit: float | None = None
    unit: str = ""

    def to_document(self) -> dict[str, Any]:
        """Return the finding as a JSON-able document."""
        return asdict(self)


def of_bubbles(curve: TitrationCurve, away: tuple[int, ...]) -> CurveFinding:
    """Return what readings were thrown off or down-weighted, by their place."""
    most = max(1, curve.size // 20)
    if not away:
        says = "No reading stands far off the curve."
    else:
        places = ", ".join(f"{curve.V[at]:g}" for at in away[:6])
        more = f" and {len(away) - 6} more" if len(away) > 6 else ""
        says = (
            f"{len(away)} of {curve.size} readings stand far off the curve and were given little "
            f"or no weight: at {places}{more} mL."
        )
    verdict: Literal["holds", "look"] = "holds" if len(away) <= most else "look"
    return CurveFinding("bubbles", verdict, says, figure=len(away), limit=most, unit="readings")


def of_spacing(clean: CleanCurve, jump: int) -> CurveFinding:
    """Return whether the points lie close enough around the jump."""
    step = float(clean.V[jump + 1] - clean.V[jump])
    share = 100 * step / float(clean.V[jump]) if clean.V[jump] > 0 else 100.0
    limit = 0.5
    fine = share <= limit
    says = f"At the jump the points lie {step:.3g} mL apart, {share:.2g} % of the volume"
    says += "." if fine else ": closer ones would make the derivative methods better."
    return CurveFinding(
        "spacing", "holds" if fine else "look", says, figure=share, limit=limit, unit="%"
    )


def of_reach(why: str, *, fit_holds: bool) -> CurveFinding:
    """Return the words on points in which nothing shows an end point; ``why`` says what misses it.

    Without a fit that holds, nothing shows that the titration was carried past its end point.
    """
    says = f"These points do not show an end point on both its sides. {why}"
    if not fit_holds:
        says += " What is read off their slopes is only the steepest of what was read."
    verdict: Literal["look", "fails"] = "look" if fit_holds else "fails"
    return CurveFinding("end point", verdict, says, "fit and derivatives")


def of_residuals(fit: ModelFit, uncertainty: EndPointUncertainty) -> CurveFinding:
    """Return whether the residuals look like scatter, in words."""
    trusted = fit.trust > 0.5
    residuals = fit.standardized[trusted]
    n = residuals.size
    r = neighbours_correlation(residuals)
    chance = 2.5 / n**0.5
    scatter, volumes = fit.reading_u, 1000 * fit.volume_u
    words = [f"Readings scatter by {scatter:.3f} about the fitted curve"]
    if volumes >= 0.5:
        words[0] += f", volumes by {volumes:.1f} µL"
    verdict: Literal["holds", "look", "fails"] = "holds"
    if r > chance and r > 0.35:
        verdict = "fails" if r > 0.6 else "look"
        words.append(
            f"neighbouring residuals go together (correlation {r:.2f}, chance allows "
            f"{chance:.2f}): the model misses a bend of this curve, and u was enlarged for it"
        )
    elif uncertainty.correlation > 1:
        words.append(f"neighbouring residuals go together a little (correlation {r:.2f})")
    else:
        words.append("the residuals show no pattern")
    if scatter > 0.05:
        verdict = "fails" if scatter > 0.1 else max(verdict, "look", key=_gravity)
        words.append("that is more than a probe in order shows")
    if uncertainty.chi2 > 2:
        verdict = max(verdict, "look", key=_gravity)
        words.append(f"they are {uncertainty.chi2**0.5:.1f} times the scatter that was given")
    return CurveFinding("residuals", verdict, "; ".join(words) + ".", figure=r, limit=chance)


def _gravity(verdict: str) -> int:
    return ("holds", "look", "fails").index(verdict)


def of_probe(fit: ModelFit) -> CurveFinding:
    """Return slope and offset of the probe as the fit has them."""
    slope, offset = 100 * fit.value("slope"), fit.value("offset")
    u = 100 * fit.u("slope")
    verdict: Literal["holds", "look", "fails"] = "holds"
    if not 95 <= slope <= 102 or abs(offset) > 0.2:
        verdict = "look"
    if not 90 <= slope <= 105 or abs(offset) > 0.5:
        verdict = "fails"
    says = (
        f"From the curve the probe has {slope:.1f} % of the ideal slope (u {u:.1f} %) and reads "
        f"{offset:+.2f} at pH 7."
    )
    basis = "95 to 102 % and 0.2 at pH 7; 90 to 105 % and 0.5: laboratory settings"
    return CurveFinding("probe", verdict, says, basis, figure=slope, limit=95.0, unit="%")


def of_constants(fit: ModelFit) -> CurveFinding:
    """Return whether the fitted pK lie where the literature has them."""
    system, worst = fit.balance.system, 0.0
    words = []
    for at, step in enumerate(system.fitted_steps):
        name = f"pK{step + 1}"
        expected, found = fit.balance.pK[step], fit.value(name)
        width = float(fit.precision_of_priors[3 + at]) ** -0.5
        worst = max(worst, abs(found - expected) / width)
        words.append(f"{name} {found:.3f}, expected {expected:.3f}")
    fine = worst <= 2
    says = "; ".join(words) + (
        "." if fine else ": further off than activities explain. Is it this substance?"
    )
    verdict: Literal["holds", "look", "fails"] = (
        "holds" if fine else "look" if worst <= 4 else "fails"
    )
    sources = "; ".join(system.analyte[step].source for step in system.fitted_steps)
    return CurveFinding("pK", verdict, says, sources, figure=worst, limit=2.0, unit="u")


def of_carbon_dioxide(residuals: CurveFinding, constants: CurveFinding) -> CurveFinding:
    """Return the words on the flask of carbonate and acid, which the model takes as closed."""
    shows = residuals.verdict != "holds" or constants.verdict != "holds"
    says = "The model takes the flask as closed. Above the first step carbon dioxide escapes: " + (
        "residuals or pK show that it may have." if shows else "residuals and pK do not show it."
    )
    return CurveFinding("carbon dioxide", "look" if shows else "holds", says, "closed flask")


def of_carbonate(fit: ModelFit) -> CurveFinding:
    """Return the carbonate in the titrant with its u."""
    f, u = fit.value("carbonate"), fit.u("carbonate")
    amount, u_amount = f * fit.chemistry.c, u * fit.chemistry.c
    percent = 100 * f
    says = (
        f"Carbonate in the titrant: {1000 * amount:.2f} mmol/L (u {1000 * u_amount:.2f}), "
        f"{percent:.2f} % of the alkalinity."
    )
    verdict: Literal["holds", "look"] = "holds"
    if f - 2 * u > 0.005:
        verdict = "look"
        says += (
            " The effective concentration counts it to hydrogencarbonate; an end point at "
            "another pH meets another volume."
        )
    elif f + 2 * u < 0:
        verdict = "look"
        says += " Less than nothing: the model bends for something else."
    return CurveFinding("carbonate", verdict, says, figure=percent, limit=0.5, unit="%")


def of_agreement(fitted: EndPoint, derivative: EndPoint) -> CurveFinding:
    """Return how far the fit lies from the first derivative, in units of the joint u."""
    apart = fitted.volume_mL - derivative.volume_mL
    joint = float(np.hypot(fitted.u_mL, derivative.u_mL))
    ratio = abs(apart) / joint
    fine = ratio <= 3
    says = (
        f"The model fit lies {abs(apart):.3f} mL {'above' if apart > 0 else 'below'} the first "
        f"derivative, {ratio:.1f} times their joint u."
    )
    if not fine:
        says += " One of the two is wrong for this curve; see the residuals and the lag."
    return CurveFinding(
        "methods agree", "holds" if fine else "look", says, figure=ratio, limit=3.0, unit="u"
    )
