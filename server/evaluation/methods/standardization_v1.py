"""Standardization, version 1: the order in which readings become a concentration with its u."""

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field, replace
from typing import Any

from server.evaluation.bench_record import BenchRecord
from server.evaluation.circumstances import Circumstances
from server.evaluation.constants import Constants
from server.evaluation.methods.model_v1 import Model, Portion, portion_of
from server.evaluation.methods.terms_v1 import (
    Term,
    between_days_term,
    end_point_terms,
    repeatability_term,
    terms_of,
)
from server.evaluation.record_fields import RecordProblem
from server.metrology.coverage import coverage_factor, printed_factor
from server.metrology.propagation import Input, Propagated, propagate
from server.statistics.outliers import f_limit
from server.statistics.spread import Summary, summarize

NAME = "standardization"
VERSION = 1
COVERAGE = 0.95

MODELS = {
    "water": "Tanaka et al. 2001, density of water",
    "air": "CIPM-2007, density of moist air; weights of 8000 kg/m3",
    "glass": "F = rho(t)/rho(20) (1 + gamma (t - 20)), or 1 + (gamma - beta)(t - 20)",
    "uncertainty": "JCGM 100 law of propagation, first order; Welch-Satterthwaite",
}


@dataclass(frozen=True, slots=True)
class ReplicateValue:
    """One replicate's value in mol/L with what it comes from; None where it was not finished.

    A mass titre is in mg/mL and has ``amount_mg`` in place of ``amount_mmol``.
    """

    label: str
    value: float | None
    mass_g: float | None
    amount_mmol: float | None
    volume_mL: float | None
    excluded: str | None
    amount_mg: float | None = None


@dataclass(frozen=True, slots=True)
class RepeatabilityUsed:
    """The relative u of the mean that counts for the spread, its dof (None: ∞), and whose it is.

    ``one_s`` is the stated relative s of one replicate and ``own_s`` the run's, where known;
    ``limit`` is √F(0.95)·one_s, above which a stated value no longer describes the run.
    """

    relative_u: float
    dof: float | None
    source: str
    own: bool
    one_s: float | None
    own_s: float | None
    limit: float | None


@dataclass(frozen=True, slots=True)
class Evaluation:
    """Result in mol/L (a mass titre: mg/mL), with everything that findings and budget need."""

    value: float
    u: float
    dof: float | None
    t_factor: float
    k: float
    replicates: tuple[ReplicateValue, ...]
    spread: Summary
    repeatability: RepeatabilityUsed
    terms: tuple[Term, ...]
    propagated: Propagated
    model: Model = field(repr=False)
    portions: tuple[Portion, ...] = field(repr=False)

    @property
    def U(self) -> float:
        """Expanded uncertainty with the printed coverage factor, mol/L."""
        return self.k * self.u

    @property
    def uncertain(self) -> tuple[Input, ...]:
        """The inputs that carry an uncertainty."""
        return tuple(term.input for term in self.terms if term.input.u > 0)

    def mean_of(self, inputs: Mapping[str, Any]) -> Any:
        """Return the mean concentration in mol/L at other values of the inputs."""
        return self.model.mean(self.portions, inputs)


def evaluate(record: BenchRecord, constants: Constants, circumstances: Circumstances) -> Evaluation:
    """Return the concentration of a standardization with its uncertainty (JCGM 100).

    Raises:
        RecordProblem: no volume is left after blank and excess, or nothing tells the repeatability.
    """
    terms = terms_of(record, constants)
    model = Model(record, constants, _estimates(terms))
    replicates = tuple(_replicate(record, model, i) for i in range(len(record.replicates)))
    counting = [one for one in record.replicates if one.excluded is None]
    portions = tuple(portion_of(record, one) for one in counting)
    values = [one.value for one in replicates if one.excluded is None and one.value is not None]
    spread = summarize(values)
    repeatability = _repeatability(record, circumstances, spread)
    # the run's own spread already holds what each curve's own fit scatters by
    terms += end_point_terms(record, own=not repeatability.own)
    terms += _spread_terms(repeatability, circumstances)
    uncertain = [term.input for term in terms if term.input.u > 0]
    propagated = propagate(lambda inputs: model.mean(portions, inputs), uncertain)
    t_factor = coverage_factor(propagated.dof, COVERAGE)
    return Evaluation(
        value=propagated.value,
        u=propagated.u,
        dof=propagated.dof,
        t_factor=t_factor,
        k=printed_factor(propagated.dof, COVERAGE),
        replicates=replicates,
        spread=spread,
        repeatability=repeatability,
        terms=terms,
        propagated=propagated,
        model=model,
        portions=portions,
    )


def replicate_values(record: BenchRecord, constants: Constants) -> tuple[ReplicateValue, ...]:
    """Return each replicate's value alone, without a budget.

    Raises:
        RecordProblem: no volume is left after blank and excess.
    """
    model = model_of(record, constants)
    return tuple(_replicate(record, model, i) for i in range(len(record.replicates)))


def model_of(record: BenchRecord, constants: Constants) -> Model:
    """Return the model of a record at its inputs' estimates, without a budget."""
    return Model(record, constants, _estimates(terms_of(record, constants)))


def with_all(record: BenchRecord) -> BenchRecord | None:
    """Return the record with its finished excluded replicates counted, None where there is none."""

    def finished(i: int) -> bool:
        one = record.replicates[i]
        read = bool(one.segments) or one.delivered is not None
        timed = record.drift is None or one.minutes is not None
        return read and timed and (not record.weighs_each or one.weighed)

    kept = [i for i in range(len(record.replicates)) if finished(i)]
    if not any(record.replicates[i].excluded is not None for i in kept):
        return None
    replicates = tuple(replace(record.replicates[i], excluded=None) for i in kept)
    return replace(record, replicates=replicates)


def _estimates(terms: Sequence[Term]) -> dict[str, float]:
    """Return every input's estimate; what the record leaves out is 0, a factor 1, water 20 °C."""
    absent: dict[str, Any] = dict.fromkeys(
        (
            "linearity",
            "balance_errors",
            "delivery",
            "blank",
            "excess",
            "end_point",
            "end_point_own",
            "drift",
            "timing",
        ),
        0.0,
    )
    absent |= {"drop": 1.0, "repeatability": 1.0, "between_days": 1.0, "temperature": 20.0}
    absent["liquid_expansion"] = None  # water by its density
    return absent | {term.input.name: term.input.value for term in terms}


def _replicate(record: BenchRecord, model: Model, index: int) -> ReplicateValue:
    one = record.replicates[index]
    if one.curve is not None and one.end_point is None and one.excluded is None:
        says = "No end point was found on this curve: read it before the record is evaluated."
        raise RecordProblem(f"replicates[{index}].curve", says, '"delivered": "18.64"')
    portion = portion_of(record, one)
    unweighed = record.weighs_each and portion.mass_g is None
    untimed = record.drift is not None and one.minutes is None
    if portion.read_mL is None or unweighed or untimed:
        return ReplicateValue(one.label, None, portion.mass_g, None, None, one.excluded)
    volume = model.volume(portion)
    if volume <= 0:
        says = f"After blank and excess {volume:.3g} mL are left: the volume must be above zero."
        key = "burette" if one.curve is None else "curve"
        raise RecordProblem(f"replicates[{index}].{key}", says, '[["0.00", "18.64"]]')
    value, by_mass = model.concentration(portion), record.route == "mass-titre"
    if value <= 0 and one.excluded is not None:
        # more came back than was added: that is why it was left out
        return ReplicateValue(one.label, None, portion.mass_g, None, volume, one.excluded)
    if value <= 0:
        says = (
            f"The excess would be used up: {volume:.4g} mL came back, as much as was added or more."
        )
        raise RecordProblem(f"replicates[{index}].burette", says, '[["0.00", "8.64"]]')
    return ReplicateValue(
        label=one.label,
        value=value,
        mass_g=portion.mass_g,
        amount_mmol=None if by_mass else model.amount(portion),
        volume_mL=volume,
        excluded=one.excluded,
        amount_mg=model.mass_mg(portion) if by_mass else None,
    )


def _repeatability(
    record: BenchRecord, circumstances: Circumstances, spread: Summary
) -> RepeatabilityUsed:
    """Return the record's repeatability, else the pooled one, else the run's own.

    Raises:
        RecordProblem: one replicate, and nothing that tells its repeatability.
    """
    n, own = spread.n, _own_repeatability(spread)
    stated, pooled = record.repeatability, circumstances.pooled
    if stated is not None:
        one_s = stated.relative_u * (math.sqrt(n) if stated.of_mean else 1.0)
        dof, source, may_swap = stated.dof, "stated repeatability", circumstances.own_where_larger
    elif pooled is not None:
        one_s, dof, source, may_swap = pooled.relative_s, pooled.dof, pooled.source, True
    elif own is not None:
        return own
    else:
        says = (
            "One replicate tells nothing about its repeatability: add a replicate, or state a "
            "validated repeatability."
        )
        raise RecordProblem("repeatability", says, '{"relative_u": "0.0005", "dof": "24"}')
    limit = None if own is None else one_s * math.sqrt(f_limit(n - 1, dof))
    if own is not None and limit is not None and may_swap and (own.own_s or 0.0) > limit:
        return replace(own, one_s=one_s, limit=limit)
    return RepeatabilityUsed(
        relative_u=one_s / math.sqrt(n),
        dof=dof,
        source=f"repeatability ({source})",
        own=False,
        one_s=one_s,
        own_s=own.own_s if own else None,
        limit=limit,
    )


def _own_repeatability(spread: Summary) -> RepeatabilityUsed | None:
    if spread.s is None:
        return None
    relative_s = spread.s / spread.mean
    return RepeatabilityUsed(
        relative_u=relative_s / math.sqrt(spread.n),
        dof=float(spread.n - 1),
        source=f"repeatability (these {spread.n} replicates)",
        own=True,
        one_s=None,
        own_s=relative_s,
        limit=None,
    )


def _spread_terms(used: RepeatabilityUsed, circumstances: Circumstances) -> tuple[Term, ...]:
    terms: tuple[Term, ...] = (repeatability_term(used.relative_u, used.dof, used.source),)
    if circumstances.between_days is not None:
        terms += (between_days_term(circumstances.between_days),)
    return terms
