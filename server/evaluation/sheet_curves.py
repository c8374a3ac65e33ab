"""The curves on a bench sheet, each analysed with what the sheet knows of it so far."""

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from server.curves.analysis import Analysis
from server.curves.circumstances import Circumstances
from server.curves.outcome import METHODS, NoEndPoint
from server.curves.points import CurveProblem
from server.evaluation.assembly import assemble, curve_entry_of
from server.evaluation.bench_record import RecordProblem, read_record
from server.evaluation.constants import resolve_constants
from server.evaluation.curve_fields import read_curve
from server.evaluation.curve_known import circumstances_known, known_of, system_between
from server.evaluation.curve_readings import able_methods, analysed_curve, points_of
from server.evaluation.from_sheet import materials_of
from server.evaluation.record_fields import Fields
from server.lab.curve_entry import METHOD_SLOT, SLOT, CurveEntry
from server.lab.ink import WrittenEntry, standing
from server.lab.sheet_facts import SheetFacts

_LIQUID_C = 20.0
_PATH_KEYS = ("curve", "method")


@dataclass(frozen=True, slots=True, eq=False)
class SheetCurve:
    """A replicate's curve as it stands on the sheet.

    ``analysis`` is None where the points make no curve; ``problem`` says in words why there is no
    analysis, or why the method that is asked for has no answer. ``taken`` is the method whose
    volume counts, ``recipe_method`` the recipe's, ``changed`` the entry that puts another in its
    place, with its reason.
    """

    replicate: int
    label: str
    entry: WrittenEntry
    curve: CurveEntry
    analysis: Analysis | None
    problem: str | None
    taken: str | None
    recipe_method: str | None
    changed: WrittenEntry | None


def curves_of_sheet(facts: SheetFacts) -> tuple[SheetCurve, ...]:
    """Return the curves that stand on a sheet, in order of replicates; odd ones with their problem.

    What the sheet lacks (a mass not weighed yet) leaves the model fit without an answer, never the
    other methods.
    """
    written = standing(facts.entries)
    draft = assemble(materials_of(facts)).draft
    drafted = {one["label"]: one for one in draft["replicates"]}
    found = []
    for (number, slot, _), entry in sorted(written.items()):
        curve = curve_entry_of(entry.raw) if slot == SLOT and number > 0 else None
        if curve is not None:
            one = drafted.get(str(number), {})
            changed = written.get((number, METHOD_SLOT, 1))
            found.append(_sheet_curve(facts, draft, one, entry=entry, curve=curve, changed=changed))
    return tuple(found)


def _sheet_curve(
    facts: SheetFacts,
    draft: Mapping[str, Any],
    one: Mapping[str, Any],
    *,
    entry: WrittenEntry,
    curve: CurveEntry,
    changed: WrittenEntry | None,
) -> SheetCurve:
    asked = facts.recipe.document.end_point.method
    analysis, problem = _analysis(facts, draft, one, curve)
    taken = changed.text if changed is not None else asked
    if analysis is not None:
        taken = taken or analysis.proposed
        problem = why_unable(analysis, taken)
    return SheetCurve(
        replicate=entry.replicate,
        label=str(entry.replicate),
        entry=entry,
        curve=curve,
        analysis=analysis,
        problem=problem,
        taken=taken,
        recipe_method=asked,
        changed=changed,
    )


def why_unable(analysis: Analysis, method: str) -> str | None:
    """Return in words why a method has no answer for a curve, None where it has one."""
    named = next((one for one in METHODS if one == method), None)
    if named is None:
        return f"There is no method {method!r}."
    outcome = analysis.outcome(named)
    if not isinstance(outcome, NoEndPoint):
        return None
    able = ", ".join(able_methods(analysis))
    return f"The {method} has no answer for this curve. {outcome.why} What has one: {able}."


def _analysis(
    facts: SheetFacts, draft: Mapping[str, Any], one: Mapping[str, Any], entry: CurveEntry
) -> tuple[Analysis | None, str | None]:
    document = {"curve": entry.to_record()}
    try:
        curve = read_curve(Fields(document, "", _PATH_KEYS), counts=True)
        if curve is None:
            return None, "There are no points."
        known = _known(facts, draft, one)
        return analysed_curve(points_of(curve), known), None
    except (RecordProblem, CurveProblem) as problem:
        return None, problem.says


def _known(facts: SheetFacts, draft: Mapping[str, Any], one: Mapping[str, Any]) -> Circumstances:
    """Return what is known beside a curve: all of it where its replicate is whole."""
    alone = {key: value for key, value in one.items() if key != "excluded"}
    try:
        record = read_record({**draft, "replicates": [alone]})
        return known_of(record, resolve_constants(record), record.replicates[0])
    except RecordProblem:
        return _known_so_far(facts, draft, one)


def _known_so_far(
    facts: SheetFacts, draft: Mapping[str, Any], one: Mapping[str, Any]
) -> Circumstances:
    recipe, lot = facts.recipe.document, facts.standard_lot
    asked = recipe.end_point
    titrant = recipe.titrant
    standard = lot.substance if lot else recipe.standard
    system = asked.system or system_between(titrant.substance, standard, medium=titrant.medium)
    read = one.get("temperature") or (draft.get("temperature") or {}).get("value")
    return circumstances_known(
        system,
        flask_volume_mL=float(asked.flask_volume_mL) if asked.flask_volume_mL else None,
        amount_mmol=None,
        temperature_C=_LIQUID_C if read is None else float(read),
    )
