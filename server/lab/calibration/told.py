"""A run's outcome as it is shown: facts, its rows, its curve of errors, its budget."""

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import Any

from server.lab.calibration.balance import BalanceOutcome
from server.lab.calibration.probe import ProbeOutcome
from server.lab.calibration.thermometer import ThermometerOutcome
from server.lab.calibration.ware_verdict import WareOutcome, WeighedRow
from server.lab.calibration.water_run import WaterRun
from server.metrology.burette_points import CurveOfErrors
from server.metrology.gravimetry import BudgetLine, Run
from server.metrology.rounding import significant

_UNITS = {"Cel": "°C", "1": "", "1/K": "/K"}


@dataclass(frozen=True, slots=True)
class CurvePoint:
    """A point of a curve of errors: the reading, what is added to it, and U (k = 2) of that."""

    reading: float
    correction: float
    U: float


@dataclass(frozen=True, slots=True)
class Told:
    """How a run is shown. ``rows`` fit ``heads``; ``limit`` bounds the curve where one is set.

    ``budget`` are rows of source, u with unit, contribution, share; ``budget_of`` says of what.
    ``volumes`` are the V20 of a gravimetric run's rows in mL, with all their digits.
    """

    facts: tuple[tuple[str, str], ...]
    heads: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]
    unit: str = ""
    curve: tuple[CurvePoint, ...] = ()
    limit: float | None = None
    budget_of: str = ""
    budget: tuple[tuple[str, ...], ...] = ()
    volumes: tuple[float, ...] = ()

    def to_document(self) -> dict[str, Any]:
        """Return it as a JSON-able document, as a run keeps it."""
        return {
            "facts": [list(one) for one in self.facts],
            "heads": list(self.heads),
            "rows": [list(one) for one in self.rows],
            "unit": self.unit,
            "curve": [[one.reading, one.correction, one.U] for one in self.curve],
            "limit": self.limit,
            "budget_of": self.budget_of,
            "budget": [list(one) for one in self.budget],
            "volumes": list(self.volumes),
        }


def read_told(document: Mapping[str, Any]) -> Told:
    """Return what a run kept."""
    return Told(
        facts=tuple((one[0], one[1]) for one in document["facts"]),
        heads=tuple(document["heads"]),
        rows=tuple(tuple(one) for one in document["rows"]),
        unit=document["unit"],
        curve=tuple(CurvePoint(*one) for one in document["curve"]),
        limit=document["limit"],
        budget_of=document["budget_of"],
        budget=tuple(tuple(one) for one in document["budget"]),
        volumes=tuple(document["volumes"]),
    )


def told_water(document: Mapping[str, Any], run: WaterRun, outcome: WareOutcome) -> Told:
    """Return a gravimetric run: every weighing with its V20 and Z, the mean or the curve."""
    limit = outcome.tolerance
    grade = f", class {run.grade}" if run.grade else ""
    facts = [
        ("Ware", f"{run.kind}, {run.nominal} mL{grade}"),
        ("Water", "air-saturated" if run.ware.air_saturated else "degassed"),
        ("Cubic expansion", f"{run.glass_expansion} /K"),
    ]
    if run.ware.evaporation_g_min:
        facts.append(("Evaporation", f"{run.ware.evaporation_g_min:g} g/min"))
    if limit is not None:
        facts.append(("Tolerance", f"± {limit.systematic_mL} mL ({limit.row})"))
    facts.append(("Decision rule", run.rule))
    budget_of = ""
    budget: tuple[tuple[str, ...], ...] = ()
    curve: tuple[CurvePoint, ...] = ()
    if outcome.run is not None:
        facts += _run_facts(outcome.run)
        budget_of, budget = "the mean", _budget(outcome.run.budget)
    if outcome.curve is not None:
        points = outcome.curve.points
        curve = tuple(CurvePoint(p.reading_mL, p.correction_mL, 2.0 * p.u_mL) for p in points)
        worst = max(points, key=lambda one: one.u_mL)
        facts += _curve_facts(outcome.curve)
        budget_of = f"the point at {worst.reading_mL:g} mL"
        budget = _budget(worst.run.budget)
    return Told(
        facts=tuple(facts),
        heads=_water_heads(run),
        rows=tuple(_water_row(document, run, one) for one in outcome.rows),
        unit="mL",
        curve=curve,
        limit=None if limit is None else float(limit.systematic_mL),
        budget_of=budget_of,
        budget=budget,
        volumes=tuple(one.found.volume_mL for one in outcome.rows),
    )


def _run_facts(found: Run) -> list[tuple[str, str]]:
    U = f"U = {significant(found.U_mL)} mL (k = {found.k:.2f})"
    spread = significant(found.s_mL) if found.s_mL else "0"
    return [
        ("Mean at 20 °C", f"{found.mean_mL:.5f} mL, {U}"),
        ("Systematic error", f"{found.systematic_mL:+.5f} mL"),
        ("Random error, s", f"{spread} mL"),
    ]


def _curve_facts(curve: CurveOfErrors) -> list[tuple[str, str]]:
    s = significant(curve.pooled_s_mL) if curve.pooled_s_mL else "0"
    return [
        ("Repeatability, s", f"{s} mL, {_freedom(curve.pooled_dof)}"),
        ("u of one delivery", f"{significant(curve.delivery_u_mL)} mL"),
    ]


def _freedom(dof: float) -> str:
    return f"{dof:g} degree{'' if dof == 1 else 's'} of freedom"


def _water_heads(run: WaterRun) -> tuple[str, ...]:
    at = ("reading, mL",) if run.has_points else ()
    return (
        *at,
        "before, g",
        "after, g",
        "net, corrected, g",
        "water, °C",
        "Z, mL/g",
        "V20, mL",
        "left out",
    )


def _water_row(document: Mapping[str, Any], run: WaterRun, one: WeighedRow) -> tuple[str, ...]:
    typed = document["weighings"][one.index]
    at = (one.point_mL or "",) if run.has_points else ()
    return (
        *at,
        str(typed.get("before") or ""),
        str(typed.get("after") or ""),
        str(typed.get("net") or f"{one.found.net_g:.4f}"),
        str(typed["water"]),
        f"{one.found.z_mL_g:.6f}",
        f"{one.found.volume_mL:.5f}",
        one.left_out,
    )


def _budget(lines: tuple[BudgetLine, ...]) -> tuple[tuple[str, ...], ...]:
    ordered = sorted(lines, key=lambda one: -one.share_percent)
    return tuple(
        (
            one.source,
            f"{significant(one.u)} {_UNITS.get(one.unit, one.unit)}".strip(),
            f"{significant(one.contribution_mL)} mL",
            f"{one.share_percent:.1f} %",
        )
        for one in ordered
    )


def told_balance(document: Mapping[str, Any], outcome: BalanceOutcome) -> Told:
    """Return a balance's calibration: every load with its error, what is added, U."""
    found, limits = outcome.found, document.get("limits") or {}
    rows = tuple(
        (
            str(typed.get("name") or typed.get("nominal") or typed["conventional"]),
            str(typed["conventional"]),
            str(typed["up"]),
            str(typed.get("down") or ""),
            f"{one.error_g:+.6f}",
            f"{one.correction_g:+.6f}",
            significant(2.0 * one.u_g),
        )
        for typed, one in zip(document["weights"], found.errors, strict=True)
    )
    return Told(
        facts=tuple(_balance_facts(document, outcome)),
        heads=("weight", "conventional, g", "up, g", "down, g", "error, g", "added, g",
               "U (k = 2), g"),
        rows=rows,
        unit="g",
        curve=tuple(
            CurvePoint(one.indication_g, one.correction_g, 2.0 * one.u_g) for one in found.errors
        ),
        limit=float(limits["error"]) if limits.get("error") else None,
    )  # fmt: skip


def _balance_facts(
    document: Mapping[str, Any], outcome: BalanceOutcome
) -> Iterator[tuple[str, str]]:
    found = outcome.found
    repeated = ", ".join(str(one) for one in document["repeatability"]["readings"])
    yield "Step of the scale", f"{document['step']} g"
    s = significant(found.s_g) if found.s_g else "0"
    yield "Repeatability", f"s = {s} g, {_freedom(found.s_dof)}"
    yield "Readings of one load", f"{repeated} g"
    yield "Smallest mass for 0.10 %", f"{significant(float(outcome.minimum_g), 3)} g (USP <41>)"
    yield "Linearity of one reading", f"± {significant(found.linearity_g)} g"
    if outcome.eccentricity is not None:
        off = ", ".join(outcome.eccentricity.positions)
        yield "Off the centre", f"{off} g; in the centre {outcome.eccentricity.centre} g"
    if document.get("air"):
        air = document["air"]
        yield "Air", f"{air['temperature']} °C, {air['pressure']} hPa, {air['humidity']} %"


def told_probe(document: Mapping[str, Any], outcome: ProbeOutcome) -> Told:
    """Return a probe's buffers with what each should read and how far the line misses it."""
    fit = outcome.fit
    facts = (
        ("Buffers by", str(document["set"])),
        ("Slope", f"{fit.slope_percent:.2f} % of Nernst, u = {significant(fit.u_slope_percent)} %"),
        ("Offset at pH 7", f"{fit.offset_mV:+.2f} mV, u = {significant(fit.u_offset_mV)} mV"),
    )
    rows = tuple(
        (
            one.buffer,
            str(typed["temperature"]),
            f"{one.pH:.3f}",
            one.source,
            f"{typed['mV']} mV" if typed.get("mV") else f"pH {typed['pH']}",
            f"{one.residual_mV:+.2f}",
        )
        for typed, one in zip(document["buffers"], outcome.rows, strict=True)
    )
    heads = ("buffer", "°C", "its pH there", "by", "read", "off the line, mV")
    return Told(facts=facts, heads=heads, rows=rows)


def told_thermometer(document: Mapping[str, Any], outcome: ThermometerOutcome) -> Told:
    """Return a thermometer beside its reference: what is added to each reading."""
    limits = document.get("limits") or {}
    return Told(
        facts=(
            ("Step of the scale", f"{document['step']} °C"),
            ("u of a corrected reading", f"{significant(outcome.u_C)} °C"),
        ),
        heads=("reading, °C", "reference, °C", "added, °C"),
        rows=tuple(
            (at, str(typed["reference"]), added)
            for typed, (at, added) in zip(document["points"], outcome.error_table, strict=True)
        ),
        unit="°C",
        curve=tuple(
            CurvePoint(float(at), float(added), 2.0 * outcome.u_C)
            for at, added in outcome.error_table
        ),
        limit=float(limits["error"]) if limits.get("error") else None,
    )
