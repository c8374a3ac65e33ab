"""The entrance of the evaluation: a bench record in, a bench result out."""

from collections.abc import Mapping
from dataclasses import dataclass
from types import ModuleType
from typing import Any

from server.evaluation import result as rows
from server.evaluation.bench_record import BenchRecord, read_record
from server.evaluation.calculations import CURRENT
from server.evaluation.circumstances import Circumstances
from server.evaluation.constants import Constants, resolve_constants
from server.evaluation.curve_readings import taken_of
from server.evaluation.curve_rows import method_rows
from server.evaluation.curve_volumes import with_end_points
from server.evaluation.findings.finding import Finding
from server.evaluation.findings.of_curves import curve_findings
from server.evaluation.findings.of_measurement import measurement_findings
from server.evaluation.findings.of_papers import paper_findings
from server.evaluation.findings.of_replicates import replicate_findings
from server.evaluation.findings.of_routes import route_findings
from server.evaluation.findings.of_simulation import simulation_finding
from server.evaluation.findings.setting import Setting
from server.evaluation.methods.standardization_v1 import Evaluation
from server.evaluation.record_fields import RecordProblem
from server.evaluation.taken_curve import TakenCurve
from server.lab.canonical import canonical, digest
from server.metrology.monte_carlo import Simulated, simulate

__all__ = ["RecordProblem", "Task", "evaluate", "evaluate_task", "running_values"]

RESULT_FORMAT = "bench-result/1"
COVERAGE = 0.95


@dataclass(frozen=True, slots=True)
class Task:
    """All that one evaluation uses; a snapshot holds the same, so that it can be repeated.

    ``curves`` are the end points found on the record's curves: a replay takes those that were
    signed, whatever a later program would find.
    """

    document: Mapping[str, Any]
    circumstances: Circumstances
    constants: Constants
    calculation: ModuleType
    trials: int | None
    seed: int
    curves: tuple[TakenCurve, ...] = ()


def evaluate(
    document: Mapping[str, Any],
    *,
    circumstances: Circumstances | None = None,
    trials: int | None = None,
    seed: int = 1,
) -> dict[str, Any]:
    """Return the bench result of a bench record.

    ``trials`` asks for Monte Carlo with at least so many trials; None or 0 for none.

    Raises:
        RecordProblem: the record cannot be read or evaluated; it names the place and an example.
    """
    return evaluate_task(make_task(document, circumstances=circumstances, trials=trials, seed=seed))


def make_task(
    document: Mapping[str, Any],
    *,
    circumstances: Circumstances | None = None,
    trials: int | None = None,
    seed: int = 1,
) -> Task:
    """Return the task of evaluating a record with today's calculation and tables.

    Raises:
        RecordProblem: the record cannot be read, or a table lacks what it leaves out.
    """
    record = read_record(document)
    _need_text(document)
    constants = resolve_constants(record)
    return Task(
        document=document,
        circumstances=circumstances or Circumstances(),
        constants=constants,
        calculation=CURRENT,
        trials=trials,
        seed=seed,
        curves=taken_of(record, constants),
    )


def evaluate_task(task: Task) -> dict[str, Any]:
    """Return the bench result of a task.

    Raises:
        RecordProblem: the record cannot be read or evaluated.
    """
    record = with_end_points(read_record(task.document), task.curves)
    evaluation = _evaluated(record, task)
    simulated = _simulate(evaluation, task) if task.trials else None
    setting = Setting(
        record=record,
        evaluation=evaluation,
        circumstances=task.circumstances,
        components=rows.components_of(evaluation),
        with_all=_with_all(record, task),
        curves=task.curves,
    )
    found: dict[str, Any] = {
        "format": RESULT_FORMAT,
        "concentration": rows.concentration(evaluation, simulated),
        "factor": rows.factor_of(record, evaluation),
        "replicates": rows.replicate_rows(evaluation),
        "spread": rows.spread_row(evaluation.spread),
        "budget": rows.budget_rows(evaluation),
        "components": rows.component_rows(setting.components),
        "monte_carlo": None if simulated is None else rows.monte_carlo_row(simulated),
        "findings": rows.finding_rows(_findings(setting, simulated)),
        "constants": rows.constants_row(task.constants, dict(task.calculation.MODELS)),
        "calculation": {"name": task.calculation.NAME, "version": task.calculation.VERSION},
        "input_digest": digest(canonical(task.document)),
    }
    if task.curves:
        found["methods"] = method_rows(record, evaluation.model, task.curves)
    if setting.with_all is not None:
        found["with_excluded"] = rows.with_excluded_row(setting.with_all, evaluation)
    return found


def running_values(document: Mapping[str, Any]) -> list[dict[str, Any]]:
    """Return each replicate's value in mol/L as far as it can be told yet, for the bench's margin.

    Each is ``{"label", "value" or None, "says", "excluded"}``; ``says`` tells what a value lacks.
    A record that is unfinished or odd gives words, never an error.
    """
    replicates = document.get("replicates")
    listed = replicates if isinstance(replicates, list | tuple) else []
    return [_running_value(document, one, i) for i, one in enumerate(listed)]


def _running_value(document: Mapping[str, Any], replicate: Any, index: int) -> dict[str, Any]:
    held = replicate if isinstance(replicate, Mapping) else {}
    excluded = held.get("excluded")
    found = {
        "label": str(held.get("label") or index + 1),
        "value": None,
        "says": "",
        "excluded": excluded if isinstance(excluded, str) else None,
    }
    alone = {key: value for key, value in held.items() if key != "excluded"}
    try:
        record = read_record({**document, "replicates": [alone]})
        constants = resolve_constants(record)
        whole = with_end_points(record, taken_of(record, constants))
        value = CURRENT.replicate_values(whole, constants)[0].value
    except RecordProblem as problem:
        return {**found, "says": problem.says}
    return {**found, "value": value}


def _need_text(document: Mapping[str, Any]) -> None:
    """Refuse a record whose text cannot be written down, for its digest could not be either."""
    try:
        canonical(document).encode()
    except (UnicodeEncodeError, TypeError, ValueError) as problem:
        says = "The record holds a character or number that no text has."
        raise RecordProblem("(record)", says) from problem


def _simulate(evaluation: Evaluation, task: Task) -> Simulated:
    """Draw the same model and inputs; compare end points at the same probability, t without 2."""
    half = evaluation.t_factor * evaluation.u
    return simulate(
        evaluation.mean_of,
        evaluation.uncertain,
        seed=task.seed,
        coverage=COVERAGE,
        trials=task.trials,
        first_order=(evaluation.value - half, evaluation.value + half),
        u=evaluation.u,
    )


def _evaluated(record: BenchRecord, task: Task) -> Evaluation:
    """Return the evaluation of a record; figures that no number holds are refused in words."""
    try:
        found: Evaluation = task.calculation.evaluate(record, task.constants, task.circumstances)
    except (OverflowError, ZeroDivisionError) as problem:
        says = "A figure is so large or so small that nothing can be reckoned with it."
        raise RecordProblem("(record)", says) from problem
    return found


def _with_all(record: BenchRecord, task: Task) -> Evaluation | None:
    """Return the evaluation with the excluded replicates counted, where there are any."""
    whole = task.calculation.with_all(record)
    if whole is None:
        return None
    try:
        return _evaluated(whole, task)
    except RecordProblem:
        return None  # what was left out has no value, so there is no mean with it


def _findings(setting: Setting, simulated: Simulated | None) -> list[Finding]:
    found = [
        *replicate_findings(setting),
        *measurement_findings(setting),
        *paper_findings(setting),
        *curve_findings(setting),
        *route_findings(setting),
    ]
    if simulated is not None:
        found.append(simulation_finding(simulated, setting))
    return found
