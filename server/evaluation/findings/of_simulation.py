"""The finding about Monte Carlo: does first order hold for this model and these inputs?"""

from server.evaluation.findings.finding import Finding
from server.evaluation.findings.setting import Setting
from server.metrology.monte_carlo import Simulated


def simulation_finding(simulated: Simulated, setting: Setting) -> Finding:
    """Return whether Monte Carlo confirms the first-order interval (JCGM 101, clause 8)."""
    unit = setting.record.unit
    half = setting.evaluation.t_factor * setting.evaluation.u
    value = setting.evaluation.value
    distance = max(abs(value - half - simulated.low), abs(value + half - simulated.high))
    holds = simulated.first_order_validated
    says = (
        f"{simulated.trials} trials give {simulated.low:.6g} to {simulated.high:.6g} {unit}; "
        + (
            "the first-order interval agrees."
            if holds
            else "the first-order interval does not agree, so this one is printed."
        )
    )
    if simulated.u is None:
        says += " An input has two degrees of freedom or fewer, so Monte Carlo has no u."
    return Finding(
        name="monte carlo",
        verdict="holds" if holds else "look",
        says=says,
        basis=f"JCGM 101, clause 8, {simulated.digits} digits of u",
        figure=distance,
        limit=simulated.delta,
        unit=unit,
        figure_text=f"{distance:.2g} {unit}",
        limit_text=f"{simulated.delta:.2g} {unit}",
    )
