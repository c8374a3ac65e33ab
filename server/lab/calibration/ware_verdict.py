"""The verdict on volumetric ware, and what its calibration states for use."""

import math
from dataclasses import dataclass
from decimal import Decimal
from typing import Any

from server.lab.calibration.check import Check, conformity_check, overall
from server.lab.calibration.typed_numbers import as_text, statement_of
from server.lab.calibration.ware_checks import budget_check, count_check, water_checks
from server.lab.calibration.water_run import WaterRun
from server.lab.refusal import Unacceptable
from server.metrology.burette_points import CurveOfErrors, evaluate_points
from server.metrology.conformity import Verdict, judge
from server.metrology.gravimetry import Run, WaterWeighing, WeighedVolume, evaluate_run
from server.metrology.gravimetry import weighed_volume as volume_of
from server.metrology.quantity import DIVISORS
from server.metrology.rounding import significant
from server.metrology.tolerances import (
    BURETTE,
    FLASK,
    PISTON_BURETTE,
    NoTolerance,
    Tolerance,
    tolerance,
)

_RUN = "gravimetric run, ISO 4787"


@dataclass(frozen=True, slots=True)
class WeighedRow:
    """One weighing as it is shown: V20 with Z and the densities; a left-out one keeps its row."""

    index: int
    point_mL: str | None
    found: WeighedVolume
    left_out: str


@dataclass(frozen=True, slots=True)
class WareOutcome:
    """A run's volumes, verdict and statements.

    ``run`` is of ware with one volume, ``curve`` of a burette; the other is None. ``document`` is
    the fragment of a bench record that serves from then on.
    """

    rows: tuple[WeighedRow, ...]
    run: Run | None
    curve: CurveOfErrors | None
    tolerance: Tolerance | None
    checks: tuple[Check, ...]
    document: dict[str, Any]

    @property
    def verdict(self) -> Verdict:
        """The gravest of the checks."""
        return overall(self.checks)


def judge_ware(run: WaterRun) -> WareOutcome:
    """Return a gravimetric run's outcome against its standard, by its own decision rule.

    Raises:
        Unacceptable: too few weighings, or no table has this ware.
    """
    rows = tuple(
        WeighedRow(
            index=one.index,
            point_mL=None if one.point is None else str(one.point),
            found=volume_of(one.weighing, run.ware),
            left_out=one.left_out,
        )
        for one in run.weighings
    )
    limit = _tolerance(run.kind, run.nominal, grade=run.grade, division=run.division)
    common = (count_check(run), *water_checks(run), budget_check(run))
    if run.has_points:
        curve = _curve(run)
        checks = (*_curve_checks(run, curve, limit), *common)
        return WareOutcome(rows, None, curve, limit, checks, _burette_document(run, curve))
    found = _single(run)
    checks = (*_single_checks(run, found, limit), *common)
    return WareOutcome(rows, found, None, limit, checks, _single_document(run, found))


def class_statement(
    kind: str,
    nominal: Decimal,
    *,
    grade: str | None,
    division: Decimal | None = None,
    glass_expansion: str | None = None,
    shape: str = "triangular",
) -> dict[str, Any]:
    """Return what serves where there is no run: the class tolerance, and that it is one.

    The shape is triangular as QUAM:2012 takes it, rectangular where nothing is known of the
    production.

    Raises:
        Unacceptable: no table has this ware, or the shape is not known.
    """
    if shape not in DIVISORS:
        says = f"shape cannot be “{shape}”; it is one of {', '.join(DIVISORS)}."
        raise Unacceptable(says, field="shape", example="triangular")
    limit = _tolerance(kind, nominal, grade=grade, division=division)
    bound = {
        "unit": "mL",
        "half_width": limit.systematic_mL,
        "shape": shape,
        "source": f"tolerance of {limit.row}, no gravimetric run",
    }
    if kind in {BURETTE, PISTON_BURETTE}:
        capacity = {"value": str(nominal), "unit": "mL"}
        stated: dict[str, Any] = {"capacity": capacity, "delivery": bound}
    else:
        stated = {_volume_key(kind): {"value": str(nominal), **bound}}
    return {**stated, "glass_expansion": glass_expansion} if glass_expansion else stated


def drop_volume(run: WaterRun, drops: int) -> tuple[float, float]:
    """Return the volume of one drop in mL with its u, from weighings of so many drops each.

    Raises:
        Unacceptable: fewer than two weighings, or no drop.
    """
    if drops < 1:
        raise Unacceptable("drops must be 1 or more.", field="drops", example="20")
    found = _single(run)
    return found.mean_mL / drops, found.u_mL / drops


def _volume_key(kind: str) -> str:
    return "volume" if kind == FLASK else "delivery"


def _tolerance(
    kind: str, nominal: Decimal, *, grade: str | None, division: Decimal | None
) -> Tolerance:
    try:
        return tolerance(kind, nominal, grade=grade, division_mL=division)
    except NoTolerance as problem:
        raise Unacceptable(problem.says, field=problem.about) from problem


def _single(run: WaterRun) -> Run:
    weighings = [one.weighing for one in run.counting]
    if len(weighings) < 2:
        says = "At least two weighings must count: one tells nothing about the random error."
        raise Unacceptable(says, field="weighings")
    return evaluate_run(weighings, run.ware, nominal_mL=float(run.nominal), errors=run.errors)


def _curve(run: WaterRun) -> CurveOfErrors:
    points: dict[float, list[WaterWeighing]] = {}
    for one in run.counting:
        points.setdefault(float(one.point or 0), []).append(one.weighing)
    try:
        return evaluate_points(points, run.ware, errors=run.errors)
    except ValueError as problem:
        raise Unacceptable(str(problem), field="weighings") from problem


def _single_checks(run: WaterRun, found: Run, limit: Tolerance) -> tuple[Check, ...]:
    systematic = judge(found.systematic_mL, float(limit.systematic_mL), rule=run.rule, U=found.U_mL)
    shown = f"{found.systematic_mL:+.5f} mL"
    says = (
        f"The mean of {len(found.volumes)} weighings is {found.mean_mL:.5f} mL at 20 °C: "
        f"{shown} ({found.systematic_percent:+.3f} %) from {run.nominal} mL, with U = "
        f"{significant(found.U_mL)} mL (k = {found.k:.2f}); permitted are ± "
        f"{limit.systematic_mL} mL."
    )
    checks = [
        conformity_check(
            "systematic error", systematic, basis=_basis(limit), unit="mL", says=says,
            shown=(shown, f"± {limit.systematic_mL} mL"),
        ),
        _uncertainty_check(found.U_mL, limit),
    ]  # fmt: skip
    if limit.random_mL is not None and found.s_mL is not None:
        dof, cv = len(found.volumes) - 1.0, f" ({found.cv_percent:.3f} %)"
        checks.insert(1, _random_check(found.s_mL, dof, limit, rule=run.rule, cv=cv))
    return tuple(checks)


def _random_check(s: float, dof: float, limit: Tolerance, *, rule: str, cv: str) -> Check:
    permitted = limit.random_mL or "0"
    # u(s) ≈ s/√(2ν) (JCGM 100, E.4.3), twice that as U
    U = 2.0 * s / math.sqrt(2.0 * dof)
    degrees = f"{dof:g} degree{'' if dof == 1 else 's'} of freedom"
    says = (
        f"The random error, the standard deviation of one delivery ({degrees}), is "
        f"{significant(s)} mL{cv}; permitted are {permitted} mL."
    )
    return conformity_check(
        "random error", judge(s, float(permitted), rule=rule, U=U),
        basis=f"{limit.row}: s of {permitted} mL ({limit.provenance})",
        unit="mL", says=says, shown=(f"{significant(s)} mL", f"{permitted} mL"),
    )  # fmt: skip


def _curve_checks(run: WaterRun, curve: CurveOfErrors, limit: Tolerance) -> tuple[Check, ...]:
    permitted = float(limit.systematic_mL)
    U = 2.0 * max(one.u_mL for one in curve.points)
    worst = max(curve.points, key=lambda one: abs(one.correction_mL))
    at_point = (
        f"The largest error of the scale is {worst.correction_mL:+.4f} mL delivered beyond the "
        f"reading, at {worst.reading_mL:g} mL, with U = {significant(U)} mL; permitted are ± "
        f"{limit.systematic_mL} mL."
    )
    between = (
        f"The errors of any two points differ by {curve.largest_between_mL:.4f} mL at most; "
        f"permitted are {limit.systematic_mL} mL."
    )
    most = f"{limit.systematic_mL} mL"
    checks = [
        conformity_check(
            "error at a point", judge(curve.largest_mL, permitted, rule=run.rule, U=U),
            basis=_basis(limit), unit="mL", says=at_point,
            shown=(f"{worst.correction_mL:+.4f} mL", f"± {most}"),
        ),
        conformity_check(
            "error between points",
            judge(curve.largest_between_mL, permitted, rule=run.rule, U=U),
            basis=f"{_basis(limit)}; the tolerance also bounds two points' difference (from "
            "memory)",
            unit="mL", says=between, shown=(f"{curve.largest_between_mL:.4f} mL", most),
        ),
        _uncertainty_check(U, limit),
    ]  # fmt: skip
    if limit.random_mL is not None:
        pooled = (curve.pooled_s_mL, curve.pooled_dof)
        checks.append(_random_check(*pooled, limit, rule=run.rule, cv=", pooled over the points"))
    return tuple(checks)


def _uncertainty_check(U: float, limit: Tolerance) -> Check:
    third = float(limit.systematic_mL) / 3.0
    good = third >= U
    words = "small enough" if good else "large: weigh more often, or state the errors closer"
    return Check(
        name="uncertainty of the run",
        verdict="holds" if good else "look",
        says=f"U = {significant(U)} mL is {words} beside the tolerance, {limit.systematic_mL} mL.",
        basis="common practice: U at most a third of the tolerance",
        figure=U,
        limit=third,
        unit="mL",
        figure_text=f"{significant(U)} mL",
        limit_text=f"{significant(third)} mL",
    )


def _basis(limit: Tolerance) -> str:
    return f"{limit.row}: ± {limit.systematic_mL} mL ({limit.provenance})"


def _single_document(run: WaterRun, found: Run) -> dict[str, Any]:
    """Return the volume with its u; a flask is filled once, so its u holds one filling's spread."""
    u, dof = found.u_mL, found.dof
    if run.kind == FLASK and found.s_mL:
        u = math.hypot(found.u_mL, found.s_mL)
        nu = len(found.volumes) - 1
        left = 0.0 if found.dof is None else found.u_mL**4 / found.dof
        dof = u**4 / (found.s_mL**4 / nu + left)
    source = f"{_RUN}, {len(found.volumes)} weighings"
    stated = {"value": as_text(found.mean_mL), **statement_of("mL", u, dof, source)}
    return {_volume_key(run.kind): stated, "glass_expansion": run.glass_expansion}


def _burette_document(run: WaterRun, curve: CurveOfErrors) -> dict[str, Any]:
    source = f"{_RUN}, {len(curve.points)} points"
    table = [[as_text(at), as_text(added)] for at, added in curve.error_table]
    return {
        "capacity": {"value": str(run.nominal), "unit": "mL"},
        "delivery": statement_of("mL", curve.delivery_u_mL, curve.delivery_dof, source),
        "error_table": table,
        "glass_expansion": run.glass_expansion,
    }
