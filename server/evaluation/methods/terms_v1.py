"""Standardization, version 1: the inputs, each with its source, root and uncertainty."""

import math
from collections.abc import Iterator
from dataclasses import dataclass

from server.evaluation.bench_record import BenchRecord
from server.evaluation.circumstances import BetweenDays
from server.evaluation.constants import Constant, Constants
from server.evaluation.methods.model_v1 import component_name
from server.evaluation.record_fields import RecordProblem, value_of
from server.evaluation.reference_fields import Reference
from server.metrology.propagation import Input
from server.metrology.quantity import Quantity

# A certificate prints u to two digits, so its components may exceed it by this much.
_PRINTED_EXCESS = 1.05


@dataclass(frozen=True, slots=True)
class Term:
    """An input of the model with its words for the budget."""

    source: str
    input: Input


def terms_of(record: BenchRecord, constants: Constants) -> tuple[Term, ...]:
    """Return the inputs that all replicates share, in the order of the budget."""
    found = [*_standard_terms(record, constants)]
    if record.weighs_each:
        found += _balance_terms(record)
    found += _air_terms(record, constants)
    found += _solution_terms(record)
    if record.route in {"against-titrant", "back"} and record.reference is not None:
        found += _reference_terms(record.reference)
    found += _added_terms(record)
    found += _volume_terms(record)
    return tuple(found)


def repeatability_term(relative_u: float, dof: float | None, source: str) -> Term:
    """Return the factor 1 that stands for the spread of the replicates; it counts once."""
    return Term(source, Input(name="repeatability", value=1.0, u=relative_u, dof=dof, shared=False))


def end_point_terms(record: BenchRecord, *, own: bool) -> tuple[Term, ...]:
    """Return the error of end points found on curves, in mL: the shared part, and each one's own.

    The shared part is one error of all curves that count, with the mean of their u; ``own`` adds
    what each scatters by for itself, over the square root of their number.
    """
    read = [one.end_point for one in record.replicates if one.excluded is None and one.end_point]
    if not read:
        return ()
    n = len(read)
    methods = sorted({one.method for one in read})
    systems = sorted({one.system for one in read if one.method == "model fit"})
    root = f"end point: {', '.join([*methods, *systems])}"
    shared = sum(one.u_shared_mL for one in read) / n
    found = [
        *_drop_terms(record),
        Term("end point", Input("end_point", 0.0, shared, id=root, unit="mL")),
    ]
    alone = math.sqrt(sum(one.u_own_mL**2 for one in read)) / n
    if own and alone > 0:
        words = "end point, scatter of each curve's own points"
        found.append(Term(words, Input("end_point_own", 0.0, alone, unit="mL", shared=False)))
    return tuple(found)


def _drop_terms(record: BenchRecord) -> Iterator[Term]:
    """Yield the factor 1 that stands for the volume of a drop, the same in all that is counted."""
    drops = [
        one.curve.drop
        for one in record.replicates
        if one.excluded is None and one.end_point and one.curve and one.curve.drop
    ]
    if drops:
        widest = max(drops, key=lambda one: one.u / value_of(one))
        ids = {one.id for one in drops}
        stated = widest.statement
        yield Term(
            "volume of a drop",
            Input(
                name="drop",
                value=1.0,
                u=widest.u / value_of(widest),
                dof=stated.dof if stated else None,
                id=widest.id if len(ids) == 1 else None,
            ),
        )


def between_days_term(history: BetweenDays) -> Term:
    """Return the factor 1 that stands for the day-to-day spread, over the days of this mean."""
    u = history.relative_s / math.sqrt(history.days)
    source = f"day-to-day spread ({history.source})"
    return Term(source, Input(name="between_days", value=1.0, u=u, dof=history.dof, shared=False))


def _of_quantity(name: str, quantity: Quantity, unit: str | None) -> Input:
    """Return a quantity as an input; a bound without a value is an error estimated as 0."""
    statement = quantity.statement
    return Input(
        name=name,
        value=quantity.value or 0.0,
        u=quantity.u,
        dof=statement.dof if statement else None,
        shape=statement.shape if statement else "normal",
        half_width=statement.half_width if statement else None,
        id=quantity.id,
        unit=unit,
    )


def _of_constant(name: str, constant: Constant, unit: str | None) -> Input:
    return Input(
        name=name,
        value=constant.value,
        u=constant.u,
        dof=constant.dof,
        shape=constant.shape,
        half_width=constant.half_width,
        id=constant.id,
        unit=unit,
    )


def _term(source: str, quantity: Quantity | None, name: str, unit: str | None) -> Iterator[Term]:
    """Yield a quantity's term where there is one, with the quantity's own source in words."""
    if quantity is not None:
        words = f"{source} ({quantity.source})" if quantity.source else source
        yield Term(words, _of_quantity(name, quantity, unit))


def _standard_terms(record: BenchRecord, constants: Constants) -> Iterator[Term]:
    if not record.weighs or record.standard is None:
        return
    standard = record.standard
    words = f"mass fraction of {standard.substance}"
    if record.route == "mass-titre":
        words = f"mass fraction of {record.analyte} in {standard.substance}"
    yield from _term(words, standard.mass_fraction, "mass_fraction", None)
    if constants.molar_mass is None:
        return
    source = f"molar mass of {standard.substance} ({constants.molar_mass.source})"
    yield Term(source, _of_constant("molar_mass", constants.molar_mass, "g/mol"))


def _balance_terms(record: BenchRecord) -> Iterator[Term]:
    if record.balance is None:
        return
    if record.balance.linearity is not None:
        yield Term("balance linearity, two indications", _linearity(record.balance.linearity))
    yield from _term("balance error table", record.balance.error_u, "balance_errors", "g")


def _linearity(bound: Quantity) -> Input:
    """Return the error of a difference of two indications: √2 times the bound's u.

    Two rectangular errors of half-width a differ by a triangular one of half-width 2a; other
    shapes are drawn as normal.
    """
    one = _of_quantity("linearity", bound, "g")
    rectangular = one.shape == "rectangular" and one.half_width is not None
    return Input(
        name=one.name,
        value=0.0,
        u=math.sqrt(2.0) * one.u,
        dof=one.dof,
        shape="triangular" if rectangular else "normal",
        half_width=2.0 * one.half_width if rectangular and one.half_width is not None else None,
        id=one.id,
        unit="g",
    )


def _air_terms(record: BenchRecord, constants: Constants) -> Iterator[Term]:
    if not record.buoyancy or record.air is None or constants.density is None:
        return
    yield from _term("air temperature", record.air.temperature, "air_temperature", "Cel")
    yield from _term("air pressure", record.air.pressure, "air_pressure", "hPa")
    yield from _term("air humidity", record.air.humidity, "air_humidity", "%")
    source = f"density of the standard ({constants.density.source})"
    yield Term(source, _of_constant("density", constants.density, "g/cm3"))


def _solution_terms(record: BenchRecord) -> Iterator[Term]:
    if record.route != "aliquot" or record.solution is None:
        return
    solution = record.solution
    yield from _term("standard solution", solution.concentration, "solution", "mol/L")
    yield from _term("mass made up", solution.mass, "solution_mass", "g")
    if solution.mass is not None and solution.flask is not None:
        yield from _term("volumetric flask", solution.flask.volume, "flask", "mL")


def _added_terms(record: BenchRecord) -> Iterator[Term]:
    """Yield the known excess of a back titration: its concentration by roots, and its volume."""
    dose = record.back.dose if record.back else None
    if dose is not None:
        yield from _reference_terms(dose.reference, "added")
        yield from _term("excess added", dose.delivery, "added_delivery", "mL")


def _reference_terms(reference: Reference, name: str = "reference") -> Iterator[Term]:
    """Yield the reference's roots one by one, and what is left of its u once they are out.

    Raises:
        RecordProblem: the components are larger than the uncertainty they are part of.
    """
    unnamed = "reference titrant" if name == "reference" else "titrant added in excess"
    through = reference.certificate or unnamed
    value = value_of(reference.concentration)
    whole = _of_quantity(name, reference.concentration, "mol/L")
    known = value * math.sqrt(sum(one**2 for one in _sums_by_root(reference).values()))
    if known > whole.u * _PRINTED_EXCESS:
        says = (
            f"The components together, {known:.3g} mol/L, are larger than the standard "
            f"uncertainty that the concentration states, {whole.u:.3g} mol/L."
        )
        path = "reference.components" if name == "reference" else "back.added.components"
        raise RecordProblem(path, says, '[{"id": "B-3", "relative": "-0.0006"}]')
    left = math.sqrt(max(0.0, whole.u**2 - known**2))
    root = whole.id or reference.certificate
    words = f"{through}, what its roots leave" if reference.components else through
    shape = "normal" if reference.components else whole.shape
    half_width = None if reference.components else whole.half_width
    yield Term(
        words,
        Input(
            name=name,
            value=value,
            u=left,
            dof=whole.dof,
            shape=shape,
            half_width=half_width,
            id=root,
            unit="mol/L",
        ),
    )
    for i, one in enumerate(reference.components):
        u = abs(one.relative)
        words = f"{one.id}, through {through}"
        yield Term(words, Input(name=component_name(i, name), value=0.0, u=u, dof=None, id=one.id))


def _sums_by_root(reference: Reference) -> dict[str, float]:
    sums: dict[str, float] = {}
    for one in reference.components:
        sums[one.id] = sums.get(one.id, 0.0) + one.relative
    return sums


def _volume_terms(record: BenchRecord) -> Iterator[Term]:
    if record.route not in {"weighed", "mass-titre"} and record.pipette is not None:
        yield from _term("pipette", record.pipette.delivery, "pipette", "mL")
    yield from _term("burette", record.burette.delivery, "delivery", "mL")
    yield from _term("temperature of the liquids", record.temperature, "temperature", "Cel")
    expansion = record.liquid_expansion
    yield from _term("expansion of the liquid", expansion, "liquid_expansion", "1/K")
    if record.zero_by_blank and record.blank is not None:
        yield from _term("blank that sets the zero", record.blank.volume, "zero", "mL")
    elif record.blank is not None:
        words = f"{record.blank.kind} blank"
        yield from _term(words, record.blank.volume, "blank", "mL")
    yield from _term("excess at the end point", record.excess, "excess", "mL")
    if record.drift is not None:
        yield from _term("drift", record.drift.rate, "drift", "ug/min")
        yield from _term("minutes of the drift", record.drift.timing, "timing", "min")
