"""A curve in words: what it shows, which method to believe, and who chose."""

from server.curves.analysis import Analysis
from server.curves.outcome import EndPoint, NoEndPoint
from server.curves.points import TitrationCurve
from server.drawing.titration.told import slope_words
from server.metrology.rounding import rounded_pair, significant
from server.sheets.parts.curve_drawn import Steps


def volume_words(found: EndPoint) -> tuple[str, str]:
    """Return an end point's volume and its standard uncertainty, both in mL."""
    return rounded_pair(found.volume_mL, found.u_mL)


def picture_says(analysis: Analysis, taken: str, steps: Steps) -> str:
    """Return the curve for those who cannot see it: points, ends, end point, greatest slope."""
    curve = analysis.curve
    steepest = max(steps, key=lambda one: one[2])
    says = (
        f"Titration curve of {curve.size} points, from {_reading(curve, 0)} at "
        f"{curve.V[0]:.4g} mL to {_reading(curve, -1)} at {curve.V[-1]:.4g} mL."
    )
    found = next((one for one in analysis.outcomes if one.method == taken), None)
    if isinstance(found, EndPoint):
        volume, u = volume_words(found)
        says += f" End point by {the(taken)}: {volume} mL, standard uncertainty {u} mL."
    greatest = f"{slope_words(steepest[2])} {curve.kind} per mL"
    says += f" Greatest slope {greatest}, between {steepest[0]:.4g} and {steepest[1]:.4g} mL."
    others = [
        f"{one.method} {volume_words(one)[0]}"
        for one in analysis.outcomes
        if isinstance(one, EndPoint) and one.method != taken
    ]
    return says + (f" Other methods, in mL: {', '.join(others)}." if others else "")


def _reading(curve: TitrationCurve, at: int) -> str:
    return f"pH {curve.y[at]:.4g}" if curve.kind == "pH" else f"{curve.y[at]:.4g} mV"


def believe(analysis: Analysis) -> str:
    """Return in one sentence which method to believe, and why."""
    method = analysis.proposed
    found = analysis.outcome(method)
    volume = f"{volume_words(found)[0]} mL" if isinstance(found, EndPoint) else "no volume"
    reach = next((one for one in analysis.findings if one.name == "end point"), None)
    if reach is not None and reach.verdict == "fails":
        none = f"Believe none of them as it stands, not {the(method)} either, {volume}"
        return f"{none}: {_lower(reach.says)}"
    because = _because_fit(analysis) if method == "model fit" else _because_other(analysis)
    return f"Believe {the(method)}, {volume}: {because}."


def _lower(says: str) -> str:
    return says[0].lower() + says[1:]


def apart_words(analysis: Analysis, taken: str | None) -> str:
    """Return how far the volume taken lies from the one to believe; nothing where they are one."""
    found = next((one for one in analysis.outcomes if one.method == taken), None)
    best = analysis.outcome(analysis.proposed)
    if taken == best.method or not (isinstance(found, EndPoint) and isinstance(best, EndPoint)):
        return ""
    apart = found.volume_mL - best.volume_mL
    size = f"{significant(abs(apart))} mL ({significant(abs(100 * apart / best.volume_mL))} %)"
    return f" That is {size} {'more' if apart > 0 else 'less'} than by {the(best.method)}."


def the(method: str) -> str:
    """Return a method's name as it stands in a sentence."""
    named = {"gran acid side": "Gran's line of the acid side",
             "gran alkaline side": "Gran's line of the alkaline side"}  # fmt: skip
    return named.get(method, f"the {method}")


def _because_fit(analysis: Analysis) -> str:
    fit = analysis.outcome("model fit")
    used = len(fit.used) if isinstance(fit, EndPoint) else 0
    parts = [f"it rests on {'all ' if used == analysis.curve.size else ''}{used} points"]
    looks = [one.name for one in analysis.findings if one.verdict == "look"]
    verdicts = {one.name: one.verdict for one in analysis.findings}
    if verdicts.get("residuals") == "holds":
        parts.append("its residuals look like scatter")
    derivative = analysis.outcome("first derivative")
    if isinstance(fit, EndPoint) and isinstance(derivative, EndPoint):
        apart = abs(fit.volume_mL - derivative.volume_mL)
        holds = verdicts.get("methods agree") == "holds"
        parts.append(
            f"the first derivative {'agrees' if holds else 'lies off'} "
            f"{'to' if holds else 'by'} {significant(apart)} mL"
        )
    says = ", ".join(parts[:-1]) + f" and {parts[-1]}" if len(parts) > 1 else parts[0]
    shown = [name for name in looks if name not in {"methods agree", "spacing"}]
    return says + (f"; look at {' and '.join(shown)} first" if shown else "")


def _because_other(analysis: Analysis) -> str:
    fit = analysis.outcome("model fit")
    if isinstance(fit, NoEndPoint):
        why = fit.why.rstrip(".")
        says = f"the model fit has no answer ({why[0].lower()}{why[1:]})"
        return f"its u is the smallest here and {says}" if _surest(analysis) else says
    failing = [one.name for one in analysis.findings if one.verdict == "fails"]
    return f"the model fit has a volume, but does not hold in {' and '.join(failing)}"


def _surest(analysis: Analysis) -> bool:
    """Tell whether the proposed method states the smallest u of all that have a volume."""
    found = [one for one in analysis.outcomes if isinstance(one, EndPoint)]
    return min(found, key=lambda one: one.u_mL).method == analysis.proposed
