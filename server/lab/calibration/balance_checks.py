"""Checks of a balance's calibration against the limits that the laboratory set."""

from collections.abc import Mapping

from server.lab.calibration.check import Check, conformity_check
from server.metrology.conformity import judge
from server.metrology.rounding import significant
from server.metrology.weighing_calibration import WeighingCalibration

ADVISED_READINGS = 10
_LIMIT_BASIS = "limit set by the laboratory"


def balance_checks(
    found: WeighingCalibration,
    *,
    readings: int,
    eccentricity_g: float | None,
    minimum_g: float,
    limits: Mapping[str, float],
    rule: str,
) -> tuple[Check, ...]:
    """Return the checks of a calibration; a limit that was not set gives its figure only."""
    checks = [_error(found, limits.get("error"), rule), _readings(found, readings)]
    if any(one.hysteresis_g is not None for one in found.errors):
        apart = f"{found.largest_hysteresis_g:.6g} g"
        words = f"Going up and coming down the readings differ by {apart} at most."
        checks.append(_figure("hysteresis", found.largest_hysteresis_g, words, limits, rule))
    if eccentricity_g is not None:
        words = f"Off the centre the reading moves by {eccentricity_g:.6g} g at most."
        checks.append(_figure("eccentricity", eccentricity_g, words, limits, rule))
    else:
        says = "The load was not read off the centre."
        basis = "common practice: eccentricity is part of a balance's calibration"
        checks.append(Check("eccentricity", "look", says, basis))
    checks.append(_minimum(minimum_g))
    return tuple(checks)


def _error(found: WeighingCalibration, limit: float | None, rule: str) -> Check:
    worst = max(found.errors, key=lambda one: abs(one.error_g))
    U = 2.0 * worst.u_g
    says = (
        f"The largest error of indication is {worst.error_g:+.6f} g at {worst.indication_g:.9g} g, "
        f"with U = {significant(U)} g (k = 2)"
    )
    shown = f"{worst.error_g:+.6f} g"
    if limit is None:
        says += "; no limit is set."
        return Check(
            "error of indication", "holds", says, "figure only: no limit is set",
            figure=worst.error_g, unit="g", figure_text=shown,
        )  # fmt: skip
    return conformity_check(
        "error of indication", judge(worst.error_g, limit, rule=rule, U=U), basis=_LIMIT_BASIS,
        unit="g", says=f"{says}; permitted are ± {limit:.6g} g.", shown=(shown, f"± {limit:.6g} g"),
    )  # fmt: skip


def _figure(name: str, figure: float, says: str, limits: Mapping[str, float], rule: str) -> Check:
    limit = limits.get(name)
    if limit is None:
        basis = "figure only: no limit is set"
        return Check(name, "holds", says, basis, figure=figure, unit="g")
    return conformity_check(
        name, judge(figure, limit, rule=rule, U=0.0), basis=_LIMIT_BASIS, unit="g",
        says=f"{says} Permitted are {limit:.6g} g.", shown=(f"{figure:.6g} g", f"{limit:.6g} g"),
    )  # fmt: skip


def _readings(found: WeighingCalibration, readings: int) -> Check:
    good = readings >= ADVISED_READINGS
    more = "" if good else f" {ADVISED_READINGS} are advised."
    return Check(
        name="repeatability",
        verdict="holds" if good else "look",
        says=f"s = {significant(found.s_g)} g from {readings} readings of one load.{more}",
        basis="USP <41>: not less than 10 replicate weighings; 5 at least here",
        figure=float(readings),
        limit=float(ADVISED_READINGS),
        figure_text=str(readings),
        limit_text=f"at least {ADVISED_READINGS}",
    )


def _minimum(minimum_g: float) -> Check:
    return Check(
        name="smallest mass",
        verdict="holds",
        says=f"The smallest net mass for 0.10 % is {significant(minimum_g, 3)} g.",
        basis="USP <41>: 2000 · max(s, 0.41 d)",
        figure=minimum_g,
        unit="g",
        figure_text=f"{significant(minimum_g, 3)} g",
    )
