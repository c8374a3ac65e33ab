"""Calibrations and runs as they are read: facts, tables, checks, curves of errors."""

from collections.abc import Mapping, Sequence
from datetime import datetime
from typing import Any

from server.drawing.error_curve import CurveWords, ErrorPoint, error_curve
from server.lab.calibration.check import Check
from server.lab.calibration.told import Told, read_told
from server.lab.sheet_facts import BALANCE, BURETTE, FLASK, PIPETTE, THERMOMETER
from server.lab.states import REPLACED, due_state
from server.metrology.rounding import rounded, rounding_exponent, significant
from server.records.queries.list_stores import KeptCalibration
from server.sheets.instruments import CalibrationView, CheckView, ErrorTable, RunView, UsedView
from server.sheets.parts.kept_files import file_view
from server.sheets.parts.telling import (
    last_day_words,
    moment_words,
    quantity_words,
    typed_day_words,
)
from server.sheets.stores import Fact

ADDED = "Correction, added to the reading"
_STATED = {
    "linearity": "Linearity of one reading",
    "error_u": "Uncertainty of the corrections",
    "capacity": "Capacity",
    "delivery": "Bound of one delivered volume",
    "volume": "Volume at 20 °C",
    "glass_expansion": "Cubic expansion of the glass",
    "reading": "One reading",
    "temperature": "Air temperature",
    "pressure": "Air pressure",
    "humidity": "Relative humidity",
    "minimum_g": "Smallest mass",
    "slope_percent": "Slope",
    "u_slope_percent": "u of the slope",
    "offset_mV": "Offset at pH 7",
    "u_offset_mV": "u of the offset",
}
_PLAIN_UNITS = {
    "glass_expansion": "/K", "minimum_g": "g", "slope_percent": "% of Nernst",
    "u_slope_percent": "%", "offset_mV": "mV", "u_offset_mV": "mV",
}  # fmt: skip
_HEADS = {
    BALANCE: ("load, g", "added, g"),
    BURETTE: ("reading, mL", "added, mL"),
    THERMOMETER: ("reading, °C", "added, °C"),
}
_COMPUTED = ("u", "half_width")
_UNITS = {BALANCE: "g", BURETTE: "mL", THERMOMETER: "°C"}
#: Which statement bounds the corrections of a table, by kind.
_BOUND = {BALANCE: "error_u", BURETTE: "delivery", THERMOMETER: "reading"}


def calibration_view(
    kind: str, name: str, one: KeptCalibration, *, now: datetime, zone: str, serves: bool
) -> CalibrationView:
    """Return a calibration of an instrument."""
    row = one.row
    recorded = Fact("Recorded", f"{moment_words(row.made_at, zone)} by {one.recorded_by}")
    run = row.run or {}
    table = error_table(kind, row.document)
    told = read_told(run["told"]) if run else None
    state = due_state(due_at=row.due_at, held=False, now=now) if serves else REPLACED
    return CalibrationView(
        version=row.version,
        url=f"/instruments/{row.instrument_id}/calibrations/{row.version}",
        certificate=row.certificate_number,
        issuer=row.issuer,
        done_on=typed_day_words(row.done_on),
        due=last_day_words(row.due_at, zone),
        due_basis=row.due_basis,
        state=state,
        verdict=str(run.get("verdict") or ""),
        facts=(*stated_facts(kind, _shortened(row.document) if run else row.document), recorded),
        table=table,
        checks=check_views(run.get("checks") or ()),
        curve=curve_of_run(name, told) if told else curve_of_table(kind, name, row.document),
        file=file_view(one.file, zone) if one.file else None,
        has_run=bool(run),
        serves=serves,
    )


def run_view(name: str, run: Mapping[str, Any]) -> RunView:
    """Return a run as its calibration keeps it."""
    told = read_told(run["told"])
    return told_view(
        name, told, check_views(run["checks"]), verdict=str(run["verdict"]),
        used=run["used"], reason=str(run.get("reason") or ""),
    )  # fmt: skip


def told_view(
    name: str,
    told: Told,
    checks: tuple[CheckView, ...],
    *,
    verdict: str,
    used: Sequence[Mapping[str, Any]],
    reason: str = "",
) -> RunView:
    """Return a run's outcome as it is read."""
    return RunView(
        verdict=verdict,
        facts=tuple(Fact(label, value) for label, value in told.facts),
        heads=told.heads,
        rows=told.rows,
        volumes=told.volumes,
        checks=checks,
        curve=curve_of_run(name, told),
        budget_of=told.budget_of,
        budget=told.budget,
        used=tuple(_used(one) for one in used),
        reason=reason,
    )


def check_views(checks: Sequence[Mapping[str, Any]]) -> tuple[CheckView, ...]:
    """Return checks as they were kept, what fails first."""
    order = {"fails": 0, "look": 1}
    views = [
        CheckView(
            name=one["name"],
            verdict=one["verdict"],
            says=one["says"],
            figure=one["figure_text"],
            limit=one["limit_text"],
            basis=one["basis"],
            rule=one["rule"],
        )
        for one in checks
    ]
    return tuple(sorted(views, key=lambda one: order.get(one.verdict, 2)))


def judged_views(checks: Sequence[Check]) -> tuple[CheckView, ...]:
    """Return checks that were just made."""
    return check_views([one.to_document() for one in checks])


def stated_facts(kind: str, document: Mapping[str, Any]) -> list[Fact]:
    """Return what a calibration states for use, digit by digit."""
    labels = _STATED | ({"delivery": "Volume at 20 °C"} if kind in {PIPETTE, FLASK} else {})
    facts = []
    for key, label in labels.items():
        stated = document.get(key)
        if isinstance(stated, Mapping):
            facts.append(Fact(label, quantity_words(stated)))
        elif stated:
            facts.append(Fact(label, f"{stated} {_PLAIN_UNITS.get(key, '')}".strip()))
    return facts


def _shortened(document: Mapping[str, Any]) -> dict[str, Any]:
    """Return what a run states, to be read: computed uncertainties to three digits."""
    shown: dict[str, Any] = {}
    for key, value in document.items():
        shown[key] = value
        if isinstance(value, Mapping):
            short = {k: significant(float(value[k]), 3) for k in _COMPUTED if value.get(k)}
            if value.get("u") and value.get("value"):
                last = rounding_exponent(float(value["u"]), digits=3)
                short["value"] = rounded(float(value["value"]), last)
            shown[key] = {**value, **short}
    if shown.get("minimum_g"):
        shown["minimum_g"] = significant(float(shown["minimum_g"]), 3)
    return shown


def error_table(kind: str, document: Mapping[str, Any]) -> ErrorTable | None:
    """Return the table of what is added to readings, or None where there is none."""
    rows = document.get("error_table")
    if not rows or kind not in _HEADS:
        return None
    return ErrorTable(ADDED, _HEADS[kind], tuple(tuple(str(cell) for cell in row) for row in rows))


def curve_of_run(name: str, told: Told) -> str:
    """Return the curve of errors of a run as a picture, empty where it has none."""
    if not told.curve:
        return ""
    points = [ErrorPoint(one.reading, one.correction, one.U) for one in told.curve]
    return error_curve(points, told=CurveWords(name, told.unit), limit=told.limit)


def curve_of_table(kind: str, name: str, document: Mapping[str, Any]) -> str:
    """Return the curve of a table that a certificate states, with U = 2 u where u is stated."""
    rows = document.get("error_table")
    if not rows or kind not in _UNITS:
        return ""
    bound = document.get(_BOUND[kind])
    U = 2.0 * float(bound["u"]) if isinstance(bound, Mapping) and bound.get("u") else 0.0
    points = [ErrorPoint(float(at), float(added), U) for at, added in rows]
    return error_curve(points, told=CurveWords(name, _UNITS[kind]), limit=None)


def _used(one: Mapping[str, Any]) -> UsedView:
    return UsedView(
        kind=one["kind"],
        name=one["name"],
        url=f"/instruments/{one['instrument_id']}/calibrations/{one['version']}",
        certificate=f"{one['certificate_number']}, version {one['version']}",
    )
