"""Findings that only back titrations and mass titres have: what came back, and the drift."""

from collections.abc import Iterator

from server.evaluation.findings.finding import Finding
from server.evaluation.findings.setting import Setting

_MOST_BACK_PERCENT = 50.0
_MOST_DRIFT_PERCENT = 50.0


def route_findings(setting: Setting) -> Iterator[Finding]:
    """Yield the findings about the excess that came back and about the drift."""
    if setting.record.route == "back":
        yield _came_back(setting)
    if setting.record.route == "mass-titre":
        yield _drift(setting)


def _came_back(setting: Setting) -> Finding:
    """Tell how much of the excess was titrated back; the more, the less the standard decides."""
    evaluation = setting.evaluation
    most = max(100.0 * evaluation.model.came_back(one) for one in evaluation.portions)
    holds = most <= _MOST_BACK_PERCENT
    says = f"Up to {most:.0f} % of the excess came back"
    if not holds:
        says += ", more than half: the result rests on the reference more than on what reacted"
    return Finding(
        name="back titration",
        verdict="holds" if holds else "look",
        says=f"{says}.",
        basis="what reacted is the difference of two amounts; at half, its relative u is doubled",
        figure=most,
        limit=_MOST_BACK_PERCENT,
        unit="%",
        figure_text=f"{most:.0f} %",
        limit_text=f"at most {_MOST_BACK_PERCENT:g} %",
    )


def _drift(setting: Setting) -> Finding:
    """Tell what the drift adds, and whether its uncertainty decides that of the titre."""
    record, evaluation = setting.record, setting.evaluation
    basis = "what gets in while one titrates uses titrant: drift times minutes, with its u"
    if record.drift is None:
        says = "No drift is counted; what got in while you titrated counts as standard."
        return Finding("drift", "look", says, basis, figure_text="none")
    rate = record.drift.rate.value or 0.0
    minutes = max(one.minutes for one in evaluation.portions)
    part = max(
        100.0 * rate * one.minutes / 1000.0 / evaluation.model.mass_mg(one)
        for one in evaluation.portions
    )
    share = 100.0 * _variance(setting, ("drift", "timing")) / evaluation.u**2
    holds = share <= _MOST_DRIFT_PERCENT and record.drift.rate.u > 0
    says = f"The drift of {rate:g} µg/min over up to {minutes:g} min is {part:.2g} % of the amount"
    says += "." if record.drift.rate.u > 0 else "; it counts without an uncertainty."
    if share > _MOST_DRIFT_PERCENT:
        says += f" It makes {share:.0f} % of the variance: let it settle, or weigh more."
    return Finding(
        name="drift",
        verdict="holds" if holds else "look",
        says=says,
        basis=basis,
        figure=share,
        limit=_MOST_DRIFT_PERCENT,
        unit="%",
        figure_text=f"{share:.0f} % of u²",
        limit_text=f"at most {_MOST_DRIFT_PERCENT:g} %",
    )


def _variance(setting: Setting, names: tuple[str, ...]) -> float:
    parts = setting.evaluation.propagated.contributions
    return float(sum(parts[name] ** 2 for name in names if name in parts))
