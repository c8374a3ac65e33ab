"""The bench result, ``bench-result/1``: a standardization's outcome as a document."""

from collections.abc import Sequence
from typing import Any

from server.evaluation.bench_record import BenchRecord
from server.evaluation.constants import Constants
from server.evaluation.findings.finding import Finding
from server.evaluation.methods.standardization_v1 import COVERAGE, Evaluation
from server.evaluation.methods.terms_v1 import Term
from server.metrology.monte_carlo import Simulated
from server.metrology.rounding import report
from server.statistics.spread import Summary


def components_of(evaluation: Evaluation) -> dict[str, float]:
    """Return the result's relative uncertainty by root, signed; equal roots are summed."""
    found: dict[str, float] = {}
    for one in evaluation.uncertain:
        if one.id is not None:
            part = evaluation.propagated.contributions[one.name] / evaluation.value
            found[one.id] = found.get(one.id, 0.0) + part
    return found


def concentration(evaluation: Evaluation, simulated: Simulated | None = None) -> dict[str, Any]:
    """Return value, u, U, k, dof and the words to print, at 20 °C in mol/L, a mass titre in mg/mL.

    Where Monte Carlo does not validate first order, its interval is the one to print (JCGM 101, 8).
    """
    unit = evaluation.model.record.unit
    reported = report(evaluation.value, evaluation.U, unit, evaluation.k)
    if simulated is not None and not simulated.first_order_validated:
        reported = _interval(evaluation, simulated)
    return {
        "value": evaluation.value,
        "u": evaluation.u,
        "U": evaluation.U,
        "k": evaluation.k,
        "dof": evaluation.dof,
        "coverage": COVERAGE,
        "unit": unit,
        "temperature_C": 20,
        "reported": reported,
    }


def _interval(evaluation: Evaluation, simulated: Simulated) -> str:
    """Return the Monte Carlo interval with the decimals that U would be printed with."""
    unit = evaluation.model.record.unit
    printed = report(evaluation.value, evaluation.U, unit, evaluation.k).split()[0]
    decimals = len(printed.partition(".")[2])
    low, high = (f"{one:.{decimals}f}" for one in (simulated.low, simulated.high))
    return f"{printed} {unit}, 95 % interval {low} to {high} {unit} (Monte Carlo)"


def replicate_rows(evaluation: Evaluation) -> list[dict[str, Any]]:
    """Return the replicates, also those left out, with what their values come from."""
    return [
        {
            "label": one.label,
            "value": one.value,
            "mass_g": one.mass_g,
            "amount_mmol": one.amount_mmol,
            "volume_mL": one.volume_mL,
            "excluded": one.excluded,
            **({} if one.amount_mg is None else {"amount_mg": one.amount_mg}),
        }
        for one in evaluation.replicates
    ]


def spread_row(spread: Summary) -> dict[str, Any]:
    """Return n, mean, s, relative s in percent and the mean's 95 % interval."""
    return {
        "n": spread.n,
        "mean": spread.mean,
        "s": spread.s,
        "rsd_percent": spread.rsd_percent,
        "ci95": None if spread.ci95 is None else list(spread.ci95),
    }


def budget_rows(evaluation: Evaluation) -> list[dict[str, Any]]:
    """Return the budget, an input a line, contributions in mol/L.

    ``contribution`` is |c_i|·u_i, its sign stands in ``sensitivity``; ``share_percent`` counts a
    line with all lines of the same root, so that the shares add to 100 even where roots cancel.
    """
    by_root = _sums_by_root(evaluation)
    return [_budget_row(term, evaluation, by_root) for term in evaluation.terms]


def _sums_by_root(evaluation: Evaluation) -> dict[str, float]:
    return {
        root: relative * evaluation.value for root, relative in components_of(evaluation).items()
    }


def _budget_row(term: Term, evaluation: Evaluation, by_root: dict[str, float]) -> dict[str, Any]:
    one = term.input
    signed = evaluation.propagated.contributions[one.name] if one.u > 0 else 0.0
    together = signed if one.id is None else by_root.get(one.id, 0.0)
    share = 100.0 * signed * together / evaluation.u**2 if evaluation.u > 0 else 0.0
    return {
        "source": term.source,
        "id": one.id,
        "value": one.value,
        "unit": one.unit,
        "u": one.u,
        "dof": one.dof,
        "shape": one.shape if one.u > 0 else "exact",
        "sensitivity": evaluation.propagated.sensitivities[one.name] if one.u > 0 else None,
        "contribution": abs(signed),
        "share_percent": share,
        "shared": one.shared,
    }


def monte_carlo_row(simulated: Simulated) -> dict[str, Any]:
    """Return the Monte Carlo outcome in mol/L."""
    return {
        "trials": simulated.trials,
        "seed": simulated.seed,
        "value": simulated.value,
        "u": simulated.u,
        "low": simulated.low,
        "high": simulated.high,
        "first_order_validated": simulated.first_order_validated,
        "digits": simulated.digits,
    }


def constants_row(constants: Constants, models: dict[str, str]) -> dict[str, Any]:
    """Return the constants that entered, with their sources."""
    found: dict[str, Any] = {
        "ratio": {"value": constants.ratio, "source": constants.ratio_source},
        "models": models,
    }
    if constants.back_ratio is not None:
        found["back_ratio"] = {
            "value": constants.back_ratio,
            "source": constants.back_ratio_source,
        }
    if constants.molar_mass is not None:
        found["atomic_weights"] = constants.atomic_weights
    for key, unit in (("molar_mass", "g/mol"), ("density", "g/cm3")):
        one = getattr(constants, key)
        if one is not None:
            found[key] = {"value": one.value, "u": one.u, "unit": unit, "source": one.source}
    return found


def with_excluded_row(evaluation: Evaluation, left_out: Evaluation) -> dict[str, Any]:
    """Return what the result would be with the excluded replicates counted."""
    return {
        "concentration": concentration(evaluation),
        "spread": spread_row(evaluation.spread),
        "shift_percent": 100.0 * (evaluation.value / left_out.value - 1.0),
    }


def component_rows(components: dict[str, float]) -> list[dict[str, Any]]:
    """Return the components by root that a certificate keeps."""
    return [{"id": root, "relative": relative} for root, relative in components.items()]


def factor_of(record: BenchRecord, evaluation: Evaluation) -> float:
    """Return the factor, concentration over nominal concentration."""
    return evaluation.value / record.titrant.nominal


def finding_rows(findings: Sequence[Finding]) -> list[dict[str, Any]]:
    """Return the findings, what fails first, then what to look at."""
    gravity = {"fails": 0, "look": 1, "holds": 2}
    return [one.to_document() for one in sorted(findings, key=lambda one: gravity[one.verdict])]
