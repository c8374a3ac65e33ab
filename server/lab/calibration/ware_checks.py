"""Checks of how a gravimetric run was done: number of weighings, water, what the budget holds."""

from collections import Counter
from collections.abc import Sequence

from server.lab.calibration.check import Check
from server.lab.calibration.water_run import WaterRun
from server.metrology.gravimetry import ERRORS
from server.metrology.tolerances import PISTON_KINDS

ADVISED_WEIGHINGS = 10
_STEADY_C = 0.5


def count_check(run: WaterRun) -> Check:
    """Return whether there are enough weighings: 10 of one volume, 2 at a point of a scale."""
    left_out = len(run.weighings) - len(run.counting)
    if run.has_points:
        counts = Counter(one.point for one in run.counting)
        least, wanted = min(counts.values(), default=0), 2
        says = f"{len(counts)} points were weighed, the rarest {_times(least)}."
        basis = "common practice: each point at least twice"
    else:
        least, wanted = len(run.counting), ADVISED_WEIGHINGS
        says = f"{least} weighings count."
        basis = "ISO 8655-6: 10 weighings; common practice for glass as well"
    if left_out:
        says += f" {left_out} left out, with reasons."
    good = least >= wanted and not left_out
    return Check(
        name="weighings",
        verdict="holds" if good else "look",
        says=says,
        basis=basis,
        figure=float(least),
        limit=float(wanted),
        figure_text=str(least),
        limit_text=f"at least {wanted}",
    )


def water_checks(run: WaterRun) -> tuple[Check, ...]:
    """Return whether the water's temperature was steady and its density is known there."""
    temperatures = [one.weighing.water_C for one in run.counting]
    span = max(temperatures) - min(temperatures) if temperatures else 0.0
    most = 2.0 * _STEADY_C
    basis = (
        "ISO 8655-6: constant within ± 0.5 °C (from memory)"
        if run.kind in PISTON_KINDS
        else "common practice: constant within ± 0.5 °C"
    )
    steady = span <= most + 1e-9
    checks = [
        Check(
            name="water temperature",
            verdict="holds" if steady else "look",
            says=f"The water was {_span(temperatures)} °C.",
            basis=basis,
            figure=span,
            limit=most,
            unit="Cel",
            figure_text=f"{span:.1f} °C",
            limit_text=f"{most:.1f} °C",
        )
    ]
    if run.ware.air_saturated and max(temperatures, default=0.0) > 25.0:
        checks.append(
            Check(
                name="air in the water",
                verdict="look",
                says="Above 25 °C what dissolved air does to the density is extrapolated; it is "
                "below 3 parts per million.",
                basis="Tanaka et al. 2001: air saturation is stated for 0 to 25 °C",
            )
        )
    return tuple(checks)


def budget_check(run: WaterRun) -> Check:
    """Return whether every error that counts has its uncertainty stated."""
    if not run.unstated:
        says = "Weighing, water and air all state their uncertainties."
        return Check("budget", "holds", says, "JCGM 100: every input that counts is evaluated")
    names = ", ".join(ERRORS[one][0] for one in run.unstated)
    return Check(
        name="budget",
        verdict="look",
        says=f"No uncertainty is stated for: {names}. U is too small by what they add.",
        basis="JCGM 100: every input that counts is evaluated",
    )


def _span(values: Sequence[float]) -> str:
    low, high = (f"{one:.1f}" for one in (min(values, default=0.0), max(values, default=0.0)))
    return low if low == high else f"{low} to {high}"


def _times(count: int) -> str:
    return {0: "never", 1: "once", 2: "twice"}.get(count, f"{count} times")
