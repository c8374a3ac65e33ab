"""The constants that a record leaves to tables: ratio, molar mass, density, with their sources."""

from collections.abc import Mapping
from dataclasses import asdict, dataclass
from fractions import Fraction
from typing import Any

from server.chemistry.atomic_weights import SET_NAME
from server.chemistry.formula import FormulaProblem, molar_mass
from server.chemistry.reactions import ratio as reaction_ratio
from server.chemistry.substances import SUBSTANCES
from server.evaluation.bench_record import BenchRecord, Standard
from server.evaluation.record_fields import RecordProblem, value_of
from server.metrology.quantity import Quantity


@dataclass(frozen=True, slots=True)
class Constant:
    """A value with its standard uncertainty, where it comes from, and its root."""

    value: float
    u: float
    source: str
    id: str | None = None
    dof: float | None = None
    shape: str = "normal"
    half_width: float | None = None


@dataclass(frozen=True, slots=True)
class Constants:
    """What an evaluation took from tables or the record's own statements.

    ``ratio`` is amount of titrant per amount of standard, as text; ``molar_mass`` in g/mol and
    ``density`` in g/cm³ are there where a mass enters. ``back_ratio`` is the amount of the added
    excess per amount of reference in a back titration.
    """

    ratio: str
    ratio_source: str
    atomic_weights: str
    molar_mass: Constant | None
    density: Constant | None
    back_ratio: str | None = None
    back_ratio_source: str | None = None

    @property
    def ratio_value(self) -> float:
        """The ratio as a number."""
        return float(Fraction(self.ratio))

    @property
    def back_ratio_value(self) -> float:
        """The ratio of excess to reference as a number, 1 where none enters."""
        return float(Fraction(self.back_ratio or "1"))


def resolve_constants(record: BenchRecord) -> Constants:
    """Return the constants of a record: its own statements first, then the tables.

    Raises:
        RecordProblem: a reaction, molar mass or density that no table knows.
    """
    ratio, source = _ratio(record)
    weighed = record.standard if record.weighs else None
    by_amount = weighed if record.route != "mass-titre" else None
    back_ratio, back_source = _back_ratio(record)
    return Constants(
        ratio=str(ratio),
        ratio_source=source,
        atomic_weights=SET_NAME,
        molar_mass=_molar_mass(by_amount) if by_amount else None,
        density=_density(weighed) if weighed and record.buoyancy else None,
        back_ratio=None if back_ratio is None else str(back_ratio),
        back_ratio_source=back_source,
    )


def to_document(constants: Constants) -> dict[str, Any]:
    """Return constants as a JSON-able document, for the snapshot."""
    document = asdict(constants)
    later = ("back_ratio", "back_ratio_source")
    # what other routes do not have stays out, so that their snapshots keep their text
    return {key: value for key, value in document.items() if key not in later or value is not None}


def read_constants(document: Mapping[str, Any]) -> Constants:
    """Return the constants that a snapshot's document holds."""
    parts = {
        key: None if document[key] is None else Constant(**document[key])
        for key in ("molar_mass", "density")
    }
    return Constants(**{**document, **parts})


def of_quantity(quantity: Quantity, source: str) -> Constant:
    """Return a stated quantity as a constant."""
    statement = quantity.statement
    return Constant(
        value=value_of(quantity),
        u=quantity.u,
        source=quantity.source or source,
        id=quantity.id,
        dof=statement.dof if statement else None,
        shape=statement.shape if statement else "normal",
        half_width=statement.half_width if statement else None,
    )


def _ratio(record: BenchRecord) -> tuple[Fraction, str]:
    """Return the stated ratio, else the reaction table's."""
    if record.route == "mass-titre":
        return Fraction(1), "none enters a mass titre"
    if record.ratio is not None:
        return record.ratio, "stated in the record"
    against = _held_against(record)
    known = reaction_ratio(record.titrant.substance, against) if against else None
    if known is None:
        says = (
            f"No reaction of {record.titrant.substance} with {against or 'an unnamed standard'} is "
            "in the table; state the amount of titrant per amount of standard."
        )
        raise RecordProblem("ratio", says, '"2/5"')
    return known, "table of reactions"


def _held_against(record: BenchRecord) -> str | None:
    """Return the substance with which the titrant reacts: standard, reference or added excess."""
    if record.back is not None and record.back.excess_to == "unknown":
        return record.back.substance
    held = record.reference if record.route == "against-titrant" else record.standard
    return held.substance if held else None


def _back_ratio(record: BenchRecord) -> tuple[Fraction | None, str | None]:
    """Return the amount of the excess per amount of reference: stated, else the table's."""
    if record.back is None:
        return None, None
    if record.back.ratio is not None:
        return record.back.ratio, "stated in the record"
    to_standard = record.back.excess_to == "standard"
    added = record.titrant.substance if to_standard else record.back.substance
    by = record.reference.substance if record.reference else None
    known = reaction_ratio(added, by) if added and by else None
    if known is None:
        says = (
            f"No reaction of {added or 'an unnamed excess'} with {by or 'an unnamed reference'} is "
            "in the table; state the amount of the excess per amount of reference."
        )
        raise RecordProblem("back.ratio", says, '"1"')
    return known, "table of reactions"


def _molar_mass(standard: Standard) -> Constant:
    if standard.molar_mass is not None:
        return of_quantity(standard.molar_mass, "stated in the record")
    substance = SUBSTANCES.get(standard.substance)
    try:
        found = molar_mass(substance.formula if substance else standard.substance)
    except FormulaProblem as problem:
        says = f"The molar mass of {standard.substance} is in no table; state it."
        example = '{"value": "204.2212", "unit": "g/mol", "u": "0.0038"}'
        raise RecordProblem("standard.molar_mass", says, example) from problem
    root = f"atomic weights, {found.set}: {standard.substance}"
    return Constant(value=found.value, u=found.u, source=found.set, id=root)


def _density(standard: Standard) -> Constant:
    if standard.density is not None:
        return of_quantity(standard.density, "stated in the record")
    substance = SUBSTANCES.get(standard.substance)
    if substance is None or substance.density_g_cm3 is None:
        says = f"The density of {standard.substance} is in no table; buoyancy needs it."
        raise RecordProblem("standard.density", says, '{"value": "1.636", "unit": "g/cm3"}')
    return Constant(value=substance.density_g_cm3, u=0.0, source=str(substance.density_source))
