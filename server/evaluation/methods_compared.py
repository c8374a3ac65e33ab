"""End-point methods compared on the sheets of a lot: which is precise, which true, and the rest."""

import json
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from math import hypot, sqrt
from statistics import fmean
from typing import Any

from server.curves.outcome import METHODS
from server.evaluation.circumstances import Circumstances, Limits, read_circumstances
from server.evaluation.findings.of_papers import unshared_u
from server.lab.ink import standing
from server.lab.sheet_facts import SheetFacts
from server.statistics.comparison import Comparison, MethodValues, Reference, compare_methods
from server.statistics.groups import GroupProblem

_END_POINT = "end point"
_FIT = "model fit"
_BY_HAND = "probe, read by hand"
_FEWEST = 2


@dataclass(frozen=True, slots=True)
class SheetOutcome:
    """One evaluated sheet: its number, its ``bench-result/1``, and how burette readings ended.

    ``read_as`` is the method of the replicates without a curve: an indicator by name, or a probe
    that somebody watched. ``circumstances`` are those of the evaluation, its limits among them.
    """

    number: str
    result: Mapping[str, Any]
    read_as: str
    circumstances: Circumstances = field(default_factory=Circumstances)

    @property
    def limits(self) -> Limits:
        """The limits that the sheet was judged by."""
        return self.circumstances.limits


@dataclass(frozen=True, slots=True)
class StatedValue:
    """A value to be true to (mol/L) with its u; ``components`` are relative and signed, by root."""

    value: float
    u: float
    name: str
    components: Mapping[str, float] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class LeftOut:
    """A method that is not compared, and why."""

    method: str
    why: str


@dataclass(frozen=True, slots=True)
class ComparedMethods:
    """Methods side by side; ``comparison`` is None where ``problem`` says why there is none.

    ``taken`` are the methods that the certified values of these sheets rest on.
    """

    sheets: tuple[str, ...]
    groups: tuple[MethodValues, ...]
    taken: tuple[str, ...]
    left_out: tuple[LeftOut, ...]
    margin_percent: float
    reference: StatedValue | None
    comparison: Comparison | None
    problem: str | None


def outcome_of(facts: SheetFacts) -> SheetOutcome | None:
    """Return what a comparison takes of a sheet; None where no evaluation of it stands."""
    if facts.evaluation is None or facts.abandoned_at is not None or facts.sent_back_at is not None:
        return None
    end_point = facts.recipe.document.end_point
    used = standing(facts.entries).get((0, "indicator", 1))
    indicator = used.text if used is not None else end_point.indicator
    read_as = f"indicator {indicator or ''}".strip()
    if end_point.mode != "visual":
        read_as = _BY_HAND
    held = json.loads(facts.evaluation.snapshot)["circumstances"]
    return SheetOutcome(facts.number, facts.evaluation.result, read_as, read_circumstances(held))


def last_certified(sheet: SheetOutcome) -> StatedValue | None:
    """Return the lot's earlier certificate, as the evaluation knew it; None for the first."""
    last = sheet.circumstances.last_certificate
    if last is None:
        return None
    return StatedValue(last.value, last.u, f"certificate {last.number}", last.components)


def compare_sheets(
    sheets: Sequence[SheetOutcome],
    *,
    margin_percent: float,
    reference: StatedValue | None = None,
) -> ComparedMethods:
    """Return the methods of one or several sheets of a lot, side by side.

    Methods read from the same curve are paired, an indicator's flasks are others than a curve's.
    Replicates left out of a result are left out here too.
    """
    values = _by_method(sheets)
    left_out = [*_too_few(values, sheets), *_unable(values, sheets)]
    groups = tuple(
        MethodValues(
            method,
            tuple(value for _, value in found),
            _u_systematic(method, sheets, reference),
            tuple(flask for flask, _ in found),
        )
        for method, found in values.items()
        if len(found) >= _FEWEST
    )
    comparison, problem = None, None
    try:
        stated = None if reference is None else Reference(reference.value, 0.0, reference.name)
        comparison = compare_methods(groups, margin_percent=margin_percent, reference=stated)
    except GroupProblem as refused:
        problem = str(refused)
    return ComparedMethods(
        sheets=tuple(one.number for one in sheets),
        groups=groups,
        taken=_taken(sheets),
        left_out=tuple(left_out),
        margin_percent=margin_percent,
        reference=reference,
        comparison=comparison,
        problem=problem,
    )


def _by_method(sheets: Sequence[SheetOutcome]) -> dict[str, list[tuple[str, float]]]:
    """Return each method's values with their flasks, the curve's methods first."""
    found: dict[str, list[tuple[str, float]]] = {method: [] for method in METHODS}
    for sheet in sheets:
        curves = {one["label"]: one for one in _curves(sheet)}
        for one in _counting(sheet):
            flask = f"{sheet.number} · {one['label']}"
            curve = curves.get(one["label"])
            if curve is None:
                found.setdefault(sheet.read_as, []).append((flask, one["value"]))
                continue
            for method, value in curve["values"].items():
                if value is not None:
                    found.setdefault(method, []).append((flask, value))
    return {method: values for method, values in found.items() if values}


def _curves(sheet: SheetOutcome) -> Sequence[Mapping[str, Any]]:
    return sheet.result.get("methods") or ()


def _counting(sheet: SheetOutcome) -> Iterator[Mapping[str, Any]]:
    for one in sheet.result["replicates"]:
        if one["excluded"] is None and one["value"] is not None:
            yield one


def _taken(sheets: Sequence[SheetOutcome]) -> tuple[str, ...]:
    found: dict[str, None] = {}
    for sheet in sheets:
        curves = {one["label"]: one for one in _curves(sheet)}
        for one in _counting(sheet):
            curve = curves.get(one["label"])
            found[sheet.read_as if curve is None else curve["taken"]] = None
    return tuple(found)


def _too_few(
    values: Mapping[str, Sequence[Any]], sheets: Sequence[SheetOutcome]
) -> Iterator[LeftOut]:
    for method, found in values.items():
        if len(found) < _FEWEST:
            yield LeftOut(method, f"one value only; {_reason(method, sheets)}".strip("; "))


def _unable(
    values: Mapping[str, Sequence[Any]], sheets: Sequence[SheetOutcome]
) -> Iterator[LeftOut]:
    if not any(_curves(sheet) for sheet in sheets):
        return
    for method in METHODS:
        if method not in values:
            yield LeftOut(method, _reason(method, sheets) or "it has no value for any curve.")


def _reason(method: str, sheets: Sequence[SheetOutcome]) -> str:
    """Return why a method has no answer for a curve, from the first curve that says so."""
    for sheet in sheets:
        for curve in _curves(sheet):
            for one in curve["methods"]:
                if one["method"] == method and "unable" in one:
                    return f"replicate {curve['label']}: {one['unable']}"
    return ""


def _u_systematic(
    method: str, sheets: Sequence[SheetOutcome], reference: StatedValue | None
) -> float:
    """Return u of a method's mean (mol/L) but for the replicates' own scatter.

    Without a reference that is the method's own part; with one u of the difference, where what a
    sheet and the reference both rest on cancels by root (JCGM 100, 5.2). Of several sheets the mean
    is taken: what they share does not get smaller by their number.
    """
    parts = [
        part for sheet in sheets if (part := _u_of_sheet(method, sheet, reference)) is not None
    ]
    return fmean(parts) if parts else 0.0


def _u_of_sheet(method: str, sheet: SheetOutcome, reference: StatedValue | None) -> float | None:
    """Return that of one sheet; None where the sheet has no value of the method."""
    end_point = _u_end_point(method, sheet)
    if end_point is None or reference is None:
        return end_point
    result = sheet.result
    value = result["concentration"]["value"]
    ends = {row["id"] for row in result["budget"] if row["source"] == _END_POINT}
    components = {
        one["id"]: one["relative"]
        for one in result.get("components") or ()
        if one["id"] not in ends
    }
    rootless = [
        row["contribution"]
        for row in result["budget"]
        if row["shared"] and row["id"] is None and row["source"] != _END_POINT
    ]
    squares = [(value * one) ** 2 for one in components.values()]
    squares += [one**2 for one in rootless]
    if method in METHODS:  # that of burette readings stands in the budget already
        squares.append(end_point**2)
    return unshared_u(
        (value, sqrt(sum(squares)), components),
        (reference.value, reference.u, dict(reference.components)),
    )


def _u_end_point(method: str, sheet: SheetOutcome) -> float | None:
    """Return what a method's end points share of u, in mol/L; None where the sheet has none."""
    if method not in METHODS:
        return _u_by_eye(method, sheet)
    found = []
    for curve in _curves(sheet):
        for one in curve["methods"]:
            if one["method"] == method and "unable" not in one:
                u = curve["fit"]["u_model_mL"] if method == _FIT else one["u_mL"]
                found.append(u / one["volume_mL"])
    return fmean(found) * sheet.result["concentration"]["value"] if found else None


def _u_by_eye(method: str, sheet: SheetOutcome) -> float | None:
    """Return what blank and excess add to u, in mol/L: all that is known of a colour's change."""
    with_curve = {one["label"] for one in _curves(sheet)}
    if method != sheet.read_as or all(one["label"] in with_curve for one in _counting(sheet)):
        return None
    parts = [row["contribution"] for row in sheet.result["budget"] if _is_by_eye(row["source"])]
    return hypot(*parts)


def _is_by_eye(source: str) -> bool:
    return source.endswith(" blank") or source.startswith("excess")
