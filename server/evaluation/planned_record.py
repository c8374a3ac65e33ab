"""A bench record that nobody has measured yet: what a recipe, lot and instruments would give."""

from collections.abc import Mapping
from dataclasses import dataclass, replace
from decimal import Decimal
from typing import Any

from server.evaluation.assembly import EntryValue, SheetMaterials, assemble
from server.evaluation.bench_record import BenchRecord, RecordProblem, read_record
from server.evaluation.calculations import CURRENT
from server.evaluation.circumstances import Circumstances
from server.evaluation.constants import resolve_constants
from server.evaluation.methods.standardization_v1 import Evaluation
from server.lab.refusal import Unacceptable

#: Conditions of a plan: the reference temperature of volumes, ordinary air.
_TEMPERATURE_C, _AIR = "20.0", ("20.0", "1013.2", "50")
_CONTAINER_G, _BLANK_ML = 30.0, "0.02"


@dataclass(frozen=True, slots=True)
class Situation:
    """What a plan starts from: the sheet's materials, what is known of its spread, replicates.

    ``use`` is the part of the burette's capacity that each replicate takes.
    """

    materials: SheetMaterials
    circumstances: Circumstances
    replicates: int
    use: float


@dataclass(frozen=True, slots=True)
class Planned:
    """A planned standardization: its evaluation, mass of standard in g (weighed route), mL."""

    evaluation: Evaluation
    mass_g: float | None
    volume_mL: float

    @property
    def U_percent(self) -> float:
        """Expanded uncertainty of the mean over its value, in percent."""
        return 100.0 * self.evaluation.U / self.evaluation.value


def capacity_mL(materials: SheetMaterials) -> float:
    """Return the burette's capacity, or where its error table ends before that.

    Raises:
        Unacceptable: it is not stated.
    """
    stated = materials.burette.get("capacity")
    if not isinstance(stated, Mapping) or not stated.get("value"):
        says = "The burette's capacity is not stated: nothing tells how much to weigh."
        raise Unacceptable(says, field="burette.capacity", example="25")
    table = materials.burette.get("error_table")
    capacity = float(Decimal(stated["value"]))
    return min(capacity, float(table[-1][0])) if table else capacity


def evaluate_planned(situation: Situation) -> Planned:
    """Return what a situation would give if every replicate came out as nominal.

    Where a standard is weighed, its mass is chosen so that the burette delivers what it should;
    elsewhere the pipette decides the volume.

    Raises:
        Unacceptable: the materials lack what the route needs, or nothing tells the repeatability.
    """
    materials = situation.materials
    wanted = situation.use * capacity_mL(materials)
    nominal = float(Decimal(materials.nominal))
    trial = _evaluate(situation, mass_g=1.0, volume_mL=wanted, replicates=1)
    if materials.route == "weighed":
        mass = nominal / trial.value
        return Planned(
            _evaluate(situation, mass_g=mass, volume_mL=wanted, replicates=situation.replicates),
            mass,
            wanted,
        )
    flask = materials.route == "against-titrant" and materials.unknown_in == "flask"
    volume = wanted * (nominal / trial.value if flask else trial.value / nominal)
    if volume > capacity_mL(materials):
        says = (
            f"The pipette's volume would need {volume:.1f} mL from a burette of "
            f"{capacity_mL(materials):g} mL: take a smaller pipette."
        )
        raise Unacceptable(says, field="pipette")
    found = _evaluate(situation, mass_g=0.0, volume_mL=volume, replicates=situation.replicates)
    return Planned(found, None, volume)


def _evaluate(
    situation: Situation, *, mass_g: float, volume_mL: float, replicates: int
) -> Evaluation:
    entries = _entries(situation.materials, mass_g, volume_mL, replicates=replicates)
    # a plan has no curve yet: its volume stands where the end point will lie
    assembled = assemble(replace(situation.materials, entries=entries, takes_curve=False))
    if assembled.document is None:
        raise Unacceptable(assembled.missing[0].says, field=assembled.missing[0].slot or None)
    try:
        record: BenchRecord = read_record(assembled.document)
        found: Evaluation = CURRENT.evaluate(
            record, resolve_constants(record), situation.circumstances
        )
    except RecordProblem as problem:
        raise Unacceptable(problem.says, field=problem.path, example=problem.example) from problem
    return found


def _entries(
    materials: SheetMaterials, mass_g: float, volume_mL: float, *, replicates: int
) -> tuple[EntryValue, ...]:
    sheet = [EntryValue(0, "temperature", 1, _TEMPERATURE_C)]
    slots = ("air_temperature", "air_pressure", "air_humidity")
    sheet += [EntryValue(0, slot, 1, text) for slot, text in zip(slots, _AIR, strict=True)]
    if materials.blank_kind is not None:
        sheet.append(EntryValue(0, "blank", 1, _BLANK_ML))
        volume_mL += float(_BLANK_ML)
    found = tuple(sheet)
    for number in range(1, replicates + 1):
        found += _replicate(materials, mass_g, volume_mL, number=number)
    return found


def _replicate(
    materials: SheetMaterials, mass_g: float, volume_mL: float, *, number: int
) -> tuple[EntryValue, ...]:
    start, end = _readings(materials, volume_mL)
    values = {"burette_start": start, "burette_end": end}
    if materials.route == "weighed":
        load = _load(materials, mass_g)
        if materials.weighing == "difference":
            values |= {"container_and_standard": load + mass_g, "container_less_standard": load}
        else:
            values |= {"mass": mass_g, "tare_load": load}
    return tuple(EntryValue(number, slot, 1, f"{value:.6f}") for slot, value in values.items())


def _readings(materials: SheetMaterials, volume_mL: float) -> tuple[float, float]:
    table: Any = materials.burette.get("error_table")
    start = float(table[0][0]) if table else 0.0
    return start, min(start + volume_mL, capacity_mL(materials))


def _load(materials: SheetMaterials, mass_g: float) -> float:
    """Return a container's mass in g that the balance's error table allows."""
    table: Any = (materials.balance or {}).get("error_table")
    if not table:
        return _CONTAINER_G
    low, high = float(table[0][0]), float(table[-1][0])
    return min(max(low, _CONTAINER_G), max(low, high - mass_g))
