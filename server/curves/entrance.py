"""The way into this room: a curve's points in, every method's equivalence volume out."""

from collections.abc import Callable
from typing import Any

from server.curves import findings
from server.curves.analysis import Analysis, proposed_method
from server.curves.circumstances import Circumstances, system_named
from server.curves.derivatives import first_derivative, second_derivative, steepest_segment
from server.curves.findings import CurveFinding
from server.curves.fitting import Fitted, fitted, in_pH, only_first_step, slowed
from server.curves.gran import GranLine, gran_line
from server.curves.jumps import CleanCurve, cleaned, jumps, steepest_about
from server.curves.model.fit import FitProblem
from server.curves.outcome import METHODS, CannotTell, EndPoint, Method, NoEndPoint, Outcome
from server.curves.points import PointsLike, TitrationCurve, titration_curve

_BY_SLOPES: dict[Method, Callable[[CleanCurve, int], EndPoint]] = {
    "steepest segment": steepest_segment,
    "first derivative": first_derivative,
    "second derivative": second_derivative,
}


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
    known = Circumstances(
        system=system_named(system),
        flask_volume_mL=flask_volume_mL,
        amount_mmol=amount_mmol,
        temperature_C=temperature_C,
    )
    return analysed(points, known).to_document()


def analysed(points: PointsLike, known: Circumstances | None = None) -> Analysis:
    """Return everything found in a curve.

    Raises:
        CurveProblem: the points make no curve.
    """
    known = known or Circumstances()
    curve = titration_curve(points)
    clean = cleaned(curve)
    other, main = _steps(curve, clean, known)
    outcomes: dict[Method, Outcome] = dict(_by_slopes(clean, main))
    lines, refused = _gran_lines(curve, clean, known, steps=(other, main))
    outcomes |= {line.end_point.method: line.end_point for line in lines}
    outcomes |= {one.method: one for one in refused}
    spacing = findings.of_spacing(clean, main)
    fit: Fitted | None = None
    try:
        fit = fitted(curve, clean, known, near_mL=clean.middle(main))
    except (CannotTell, FitProblem) as problem:
        outcomes["model fit"] = NoEndPoint("model fit", str(problem))
        notes = [findings.of_bubbles(curve, clean.bubbles), spacing]
        if isinstance(problem, FitProblem):
            notes.append(findings.of_reach(str(problem), fit_holds=False))
    else:
        outcomes = {method: slowed(one, fit.lag) for method, one in outcomes.items()}
        outcomes["model fit"] = fit.end_point()
        notes = [*_fit_findings(curve, fit, outcomes), spacing]
    if all(one.name != "end point" for one in notes):
        notes += _reach(outcomes, notes)
    return Analysis(
        curve=curve,
        clean=clean,
        jump=main,
        outcomes=tuple(outcomes[method] for method in METHODS),
        other_step=_other_step(clean, other, known, fit),
        proposed=proposed_method(outcomes, notes),
        fitted=fit,
        gran=tuple(lines),
        findings=tuple(notes),
    )


def _steps(
    curve: TitrationCurve, clean: CleanCurve, known: Circumstances
) -> tuple[int | None, int]:
    """Return the segment of an earlier jump (None: there is none) and that of the last one."""
    found = jumps(clean)
    if len(found) == 1 and only_first_step(curve, known, clean.at[found[0]]):
        # the last step is shallower than the first and drowned: look where it must be
        share = known.system.inner_step if known.system else None
        last = steepest_about(clean, clean.middle(found[0]) / (share or 0.5))
        if last is not None:
            found = [found[0], last]
    return (found[-2] if len(found) > 1 else None), found[-1]


def _by_slopes(clean: CleanCurve, jump: int) -> dict[Method, Outcome]:
    answers: dict[Method, Outcome] = {}
    for method, work in _BY_SLOPES.items():
        try:
            answers[method] = work(clean, jump)
        except CannotTell as problem:
            answers[method] = NoEndPoint(method, str(problem))
    return answers


def _other_step(
    clean: CleanCurve, jump: int | None, known: Circumstances, fit: Fitted | None
) -> tuple[Outcome, ...]:
    answers: list[Outcome] = []
    if jump is not None:
        by_slopes = _by_slopes(clean, jump).values()
        answers += by_slopes if fit is None else [slowed(one, fit.lag) for one in by_slopes]
    if fit is not None and known.system is not None and known.system.inner_step:
        answers.append(fit.inner_end_point(known.system.inner_step))
    return tuple(answers)


def _gran_lines(
    curve: TitrationCurve,
    clean: CleanCurve,
    known: Circumstances,
    *,
    steps: tuple[int | None, int],
) -> tuple[list[GranLine], list[NoEndPoint]]:
    """Return the lines that could be drawn and the sides that could not."""
    sides: tuple[Method, Method] = ("gran acid side", "gran alkaline side")
    if curve.kind == "mV" and known.system is None:
        why = (
            "The readings are in mV and the reaction is not known: Gran's functions need the "
            "electrode's slope and what the electrode answers to."
        )
        return [], [NoEndPoint(method, why) for method in sides]
    pH = in_pH(curve, known)[list(clean.at)]
    other, main = steps
    near = clean.middle(main)
    inner = None if other is None else clean.middle(other)
    if known.system is not None:
        inner = None if known.system.inner_step is None else near * known.system.inner_step
    lines: list[GranLine] = []
    refused: list[NoEndPoint] = []
    named = sides if pH[-1] >= pH[0] else sides[::-1]
    for method, side in zip(named, ("before", "beyond"), strict=True):
        try:
            lines.append(
                gran_line(
                    clean,
                    pH,
                    side=side,
                    near_mL=near,
                    flask_volume_mL=known.flask_volume_mL,
                    inner_mL=inner,
                )
            )
        except CannotTell as problem:
            refused.append(NoEndPoint(method, str(problem)))
    return lines, refused


def _reach(outcomes: dict[Method, Outcome], notes: list[CurveFinding]) -> list[CurveFinding]:
    """Return a finding where neither derivative has a volume."""
    first, second = outcomes["first derivative"], outcomes["second derivative"]
    if not isinstance(first, NoEndPoint) or not isinstance(second, NoEndPoint):
        return []
    fit_stands = isinstance(outcomes["model fit"], EndPoint)
    holds = fit_stands and all(one.verdict != "fails" for one in notes)
    return [findings.of_reach(first.why, fit_holds=holds)]


def _fit_findings(
    curve: TitrationCurve, fit: Fitted, outcomes: dict[Method, Outcome]
) -> list[CurveFinding]:
    residuals = findings.of_residuals(fit.fit, fit.uncertainty)
    constants = findings.of_constants(fit.fit)
    made = [
        findings.of_bubbles(curve, fit.down_weighted),
        residuals,
        fit.lag.finding,
        findings.of_probe(fit.fit),
        constants,
    ]
    if fit.fit.balance.system.takes_up_carbonate:
        made.append(findings.of_carbonate(fit.fit))
    elif fit.fit.balance.system.inner_step is not None:
        made.append(findings.of_carbon_dioxide(residuals, constants))
    fit_answer, derivative = outcomes["model fit"], outcomes["first derivative"]
    if isinstance(fit_answer, EndPoint) and isinstance(derivative, EndPoint):
        made.append(findings.of_agreement(fit_answer, derivative))
    return made
