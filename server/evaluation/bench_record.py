"""The bench record, ``bench-record/1``: a standardization as it was measured, read and checked."""

from collections.abc import Mapping
from dataclasses import dataclass
from fractions import Fraction
from typing import Any

from server.evaluation.curve_fields import AskedEndPoint, read_end_point
from server.evaluation.record_fields import Fields, RecordProblem, Table, value_of
from server.evaluation.reference_fields import (
    REFERENCE_KEYS,
    Reference,
    glass_expansion,
    reference_of,
)
from server.evaluation.replicate_reading import Replicate, read_replicates
from server.evaluation.route_fields import (
    Back,
    Drift,
    check_back,
    read_analyte,
    read_back,
    read_drift,
)
from server.metrology.quantity import Quantity

__all__ = ["BenchRecord", "RecordProblem", "read_record"]

FORMAT = "bench-record/1"
ROUTES = ("weighed", "aliquot", "against-titrant", "back", "mass-titre")
WATER_RANGE_C = (0.0, 40.0)  # Tanaka's equation holds here
_KEYS = frozenset(
    "format titrant route ratio standard solution reference unknown_in balance air burette pipette "
    "temperature liquid_expansion blank excess repeatability replicates end_point "
    "back titre_of drift".split()
)


@dataclass(frozen=True, slots=True)
class Titrant:
    """What is standardized: substance, nominal value in mol/L (a mass titre: mg/mL), medium."""

    substance: str
    nominal: float
    medium: str


@dataclass(frozen=True, slots=True)
class Standard:
    """The primary standard: mass fraction on its basis; molar mass g/mol, density g/cm³ if told."""

    substance: str
    mass_fraction: Quantity
    basis: str | None
    molar_mass: Quantity | None
    density: Quantity | None


@dataclass(frozen=True, slots=True)
class Flask:
    """A volumetric flask: volume in mL at 20 °C, glass expansion per K, its own temperature."""

    volume: Quantity
    glass_expansion: float
    temperature: float | None


@dataclass(frozen=True, slots=True)
class Solution:
    """The standard solution: a stated concentration in mol/L, or a mass in g made up in a flask."""

    concentration: Quantity | None
    mass: Quantity | None
    flask: Flask | None


@dataclass(frozen=True, slots=True)
class Balance:
    """The balance: bound of one reading, error table in g, u of the errors, buoyancy or not."""

    linearity: Quantity | None
    error_table: Table
    error_u: Quantity | None
    buoyancy: bool


@dataclass(frozen=True, slots=True)
class Air:
    """Room air: temperature in °C, pressure in hPa, relative humidity in %."""

    temperature: Quantity
    pressure: Quantity
    humidity: Quantity


@dataclass(frozen=True, slots=True)
class Burette:
    """The burette: capacity mL, bound of one delivered segment, error table mL, glass per K."""

    capacity: float | None
    delivery: Quantity | None
    error_table: Table
    glass_expansion: float


@dataclass(frozen=True, slots=True)
class Pipette:
    """The pipette: delivered volume in mL at 20 °C, glass expansion per K, own temperature."""

    delivery: Quantity
    glass_expansion: float
    temperature: float | None


@dataclass(frozen=True, slots=True)
class Blank:
    """A blank in mL and its kind, ``reagent`` or ``indicator``.

    In a back titration also ``zero``: what the excess alone takes of the reference, as the
    burette delivered it in one filling at the temperature of the liquids.
    """

    volume: Quantity
    kind: str


@dataclass(frozen=True, slots=True)
class Repeatability:
    """A stated repeatability: relative u of one replicate or of the mean, its dof (None: ∞)."""

    relative_u: float
    dof: float | None
    of_mean: bool


@dataclass(frozen=True, slots=True)
class BenchRecord:
    """A standardization as measured; volumes mL, masses g, temperatures °C, amounts mol/L."""

    titrant: Titrant
    route: str
    ratio: Fraction | None
    standard: Standard | None
    solution: Solution | None
    reference: Reference | None
    unknown_in: str | None
    balance: Balance | None
    air: Air | None
    burette: Burette
    pipette: Pipette | None
    temperature: Quantity | None
    liquid_expansion: Quantity | None
    blank: Blank | None
    excess: Quantity | None
    repeatability: Repeatability | None
    replicates: tuple[Replicate, ...]
    end_point: AskedEndPoint | None = None
    back: Back | None = None
    analyte: str | None = None
    drift: Drift | None = None

    @property
    def unit(self) -> str:
        """The unit of the result: mg/mL of a mass titre, else mol/L."""
        return "mg/mL" if self.route == "mass-titre" else "mol/L"

    @property
    def weighs_each(self) -> bool:
        """Whether each replicate has a mass of standard of its own."""
        to_standard = self.back is not None and self.back.excess_to == "standard"
        return self.route in {"weighed", "mass-titre"} or to_standard

    @property
    def zero_by_blank(self) -> bool:
        """Whether the blank is what the excess of a back titration takes alone."""
        return self.blank is not None and self.blank.kind == "zero"

    @property
    def weighs(self) -> bool:
        """Whether the standard's mass, mass fraction and molar mass enter the result."""
        made_up = self.solution is not None and self.solution.mass is not None
        return self.weighs_each or (self.route == "aliquot" and made_up)

    @property
    def buoyancy(self) -> bool:
        """Whether the weighed mass is corrected for the buoyancy of air."""
        return self.weighs and self.balance is not None and self.balance.buoyancy


def read_record(document: Mapping[str, Any]) -> BenchRecord:
    """Return the bench record that a document holds.

    Raises:
        RecordProblem: an unknown key, a missing part, a wrong unit, a value that cannot be.
    """
    top = Fields(document, "", _KEYS)
    top.choice("format", (FORMAT,))
    route = top.choice("route", ROUTES)
    back = read_back(top, route)
    drift = read_drift(top, route)
    record = BenchRecord(
        titrant=_titrant(top, "mg/mL" if route == "mass-titre" else "mol/L"),
        route=route,
        ratio=top.ratio("ratio"),
        standard=_standard(top),
        solution=_solution(top),
        reference=_reference(top),
        unknown_in=top.choice("unknown_in", ("burette", "flask"))
        if route == "against-titrant" or top.has("unknown_in")
        else None,
        balance=_balance(top),
        air=_air(top),
        burette=(burette := _burette(top)),
        pipette=_pipette(top),
        temperature=top.quantity("temperature", "Cel"),
        liquid_expansion=top.quantity("liquid_expansion", "1/K"),
        blank=_blank(top, route),
        excess=top.quantity("excess", "mL"),
        repeatability=_repeatability(top),
        replicates=read_replicates(
            top,
            weighed=route in {"weighed", "mass-titre"}
            or (back is not None and back.excess_to == "standard"),
            table=burette.error_table,
            capacity=burette.capacity,
            timed=drift is not None,
        ),
        end_point=read_end_point(top),
        back=back,
        analyte=read_analyte(top, route),
        drift=drift,
    )
    _check_route(top, record)
    _check_liquids(top, record)
    _check_masses(top, record)
    return record


def _titrant(top: Fields, unit: str) -> Titrant:
    top.need("titrant", '{"substance": "NaOH", "nominal": {"value": "0.1", "unit": "mol/L"}}')
    fields = Fields(top.document["titrant"], "titrant", ("substance", "nominal", "medium"))
    substance = fields.text("substance", '"NaOH"')
    nominal = fields.need_quantity("nominal", unit)
    medium = fields.text("medium", '"water"', required=False) or "water"
    return Titrant(substance=str(substance), nominal=value_of(nominal), medium=medium)


def _standard(top: Fields) -> Standard | None:
    if not top.has("standard"):
        return None
    keys = ("substance", "mass_fraction", "basis", "molar_mass", "density")
    fields = Fields(top.document["standard"], "standard", keys)
    mass_fraction = fields.need_quantity("mass_fraction", None)
    if value_of(mass_fraction) > 1.05:
        says = "A mass fraction is a part of 1, not a percentage; an assay can pass 1 by little."
        fields.refuse("mass_fraction.value", says, '"0.9998"')
    return Standard(
        substance=str(fields.text("substance", '"KHP"')),
        mass_fraction=mass_fraction,
        basis=fields.choice("basis", ("as is", "dried")) if fields.has("basis") else None,
        molar_mass=_positive(fields, "molar_mass", "g/mol"),
        density=_positive(fields, "density", "g/cm3"),
    )


def _positive(fields: Fields, key: str, unit: str | None) -> Quantity | None:
    return fields.need_quantity(key, unit) if fields.has(key) else None


def _solution(top: Fields) -> Solution | None:
    if not top.has("solution"):
        return None
    fields = Fields(top.document["solution"], "solution", ("concentration", "mass", "flask"))
    if fields.has("concentration") == fields.has("mass"):
        says = "State either the concentration at 20 Cel, or the mass and the flask."
        fields.refuse("concentration", says, '{"value": "0.1000", "unit": "mol/L"}')
    return Solution(
        concentration=_positive(fields, "concentration", "mol/L"),
        mass=_positive(fields, "mass", "g"),
        flask=_flask(fields) if fields.has("mass") or fields.has("flask") else None,
    )


def _flask(solution: Fields) -> Flask:
    solution.need("flask", '{"volume": {"value": "250.00", "unit": "mL"}}')
    keys = ("volume", "glass_expansion", "temperature")
    fields = Fields(solution.document["flask"], "solution.flask", keys)
    return Flask(
        volume=fields.need_quantity("volume", "mL"),
        glass_expansion=glass_expansion(fields),
        temperature=fields.decimal("temperature", "20.0"),
    )


def _reference(top: Fields) -> Reference | None:
    if not top.has("reference"):
        return None
    return reference_of(Fields(top.document["reference"], "reference", REFERENCE_KEYS))


def _balance(top: Fields) -> Balance | None:
    if not top.has("balance"):
        return None
    keys = ("linearity", "error_table", "error_u", "buoyancy")
    fields = Fields(top.document["balance"], "balance", keys)
    return Balance(
        linearity=fields.bound("linearity", "g"),
        error_table=fields.error_table("error_table", "load"),
        error_u=fields.bound("error_u", "g"),
        buoyancy=fields.flag("buoyancy"),
    )


def _air(top: Fields) -> Air | None:
    if not top.has("air"):
        return None
    fields = Fields(top.document["air"], "air", ("temperature", "pressure", "humidity"))
    bounds = (
        ("temperature", "Cel", 0.0, 50.0, "20.0"),
        ("pressure", "hPa", 500.0, 1100.0, "1013.2"),
        ("humidity", "%", 0.0, 100.0, "45"),
    )
    read = {}
    for key, unit, low, high, example in bounds:
        fields.need(key, f'{{"value": "{example}", "unit": "{unit}"}}')
        quantity = fields.quantity(key, unit)
        if quantity is None or not low <= value_of(quantity) <= high:
            says = f"The air's {key} must lie between {low:g} and {high:g} {unit}."
            fields.refuse(f"{key}.value", says, f'"{example}"')
        read[key] = quantity
    return Air(**read)


def _burette(top: Fields) -> Burette:
    keys = ("capacity", "delivery", "error_table", "glass_expansion")
    fields = Fields(top.document.get("burette") or {}, "burette", keys)
    capacity = _positive(fields, "capacity", "mL")
    return Burette(
        capacity=None if capacity is None else value_of(capacity),
        delivery=fields.bound("delivery", "mL"),
        error_table=fields.error_table("error_table", "reading"),
        glass_expansion=glass_expansion(fields),
    )


def _pipette(top: Fields) -> Pipette | None:
    if not top.has("pipette"):
        return None
    keys = ("delivery", "glass_expansion", "temperature")
    fields = Fields(top.document["pipette"], "pipette", keys)
    return Pipette(
        delivery=fields.need_quantity("delivery", "mL"),
        glass_expansion=glass_expansion(fields),
        temperature=fields.decimal("temperature", "20.0"),
    )


def _blank(top: Fields, route: str) -> Blank | None:
    if not top.has("blank"):
        return None
    document = top.document["blank"]
    kinds = Fields(document, "blank", tuple(document) if isinstance(document, Mapping) else ())
    known = ("reagent", "indicator", *(("zero",) if route == "back" else ()))
    kind = kinds.choice("kind", known)
    volume = {key: value for key, value in document.items() if key != "kind"}
    quantity = Fields({"blank": volume}, "", ("blank",)).quantity("blank", "mL")
    return None if quantity is None else Blank(volume=quantity, kind=kind)


def _repeatability(top: Fields) -> Repeatability | None:
    if not top.has("repeatability"):
        return None
    keys = ("relative_u", "dof", "applies_to", "from")
    fields = Fields(top.document["repeatability"], "repeatability", keys)
    if fields.has("from"):
        fields.choice("from", ("replicates",))
        if fields.has("relative_u"):
            fields.refuse("from", "State relative_u or from, not both.", '{"from": "replicates"}')
        return None
    fields.need("relative_u", '"0.0005"')
    relative_u, dof = fields.decimal("relative_u", "0.0005"), fields.decimal("dof", "24")
    if relative_u is None or relative_u < 0:
        fields.refuse("relative_u", "A relative uncertainty cannot be negative.", '"0.0005"')
    if dof is not None and dof <= 0:
        fields.refuse("dof", "Degrees of freedom must be above zero.", '"24"')
    applies_to = fields.choice("applies_to", ("one", "mean"), default="one")
    return Repeatability(relative_u=relative_u, dof=dof, of_mean=applies_to == "mean")


def _check_route(top: Fields, record: BenchRecord) -> None:
    """Refuse a record that lacks what its route needs."""
    needed = {
        "weighed": {"standard": '{"substance": "KHP", "mass_fraction": {"value": "0.9998"}}'},
        "aliquot": {
            "solution": '{"concentration": {"value": "0.1000", "unit": "mol/L"}}',
            "pipette": '{"delivery": {"value": "25.00", "unit": "mL"}}',
        },
        "against-titrant": {
            "reference": '{"substance": "NaOH", "concentration": {"value": "0.1", ...}}',
            "pipette": '{"delivery": {"value": "25.00", "unit": "mL"}}',
        },
        "back": {
            "reference": '{"substance": "HCl", "concentration": {"value": "0.1", ...}}',
            "pipette": '{"delivery": {"value": "25.00", "unit": "mL"}}',
        },
        "mass-titre": {
            "standard": '{"substance": "H2O", "mass_fraction": {"value": "0.01002"}}',
        },
    }[record.route]
    for key, example in needed.items():
        if not top.has(key):
            top.refuse(key, f'The route "{record.route}" needs this.', example)
    if record.weighs and record.standard is None:
        says = (
            "The excess is added to a weighed standard: state it."
            if record.route == "back"
            else "A standard solution made up by weighing needs its standard."
        )
        top.refuse("standard", says, '{"substance": "KIO3", "mass_fraction": {"value": "0.9995"}}')
    if record.back is not None:
        check_back(top, record.back, record.blank.kind if record.blank else None)
    if record.buoyancy and record.air is None:
        says = "With buoyancy the air's temperature, pressure and humidity are needed."
        top.refuse("air", says, '{"temperature": {"value": "20.0", "unit": "Cel"}, ...}')


def _check_liquids(top: Fields, record: BenchRecord) -> None:
    """Refuse a medium without its expansion and temperatures outside the water equation."""
    stated = record.liquid_expansion is not None
    if record.titrant.medium != "water" and not stated:
        says = (
            f"In {record.titrant.medium!r} the liquid does not expand as water does: state its "
            "cubic expansion."
        )
        top.refuse("liquid_expansion", says, '{"value": "1.1e-3", "unit": "1/K"}')
    low, high = (-20.0, 120.0) if stated else WATER_RANGE_C
    for path, value in _temperatures(record):
        if not low <= value <= high:
            says = (
                f"{value:g} Cel lies outside {low:g} to {high:g} Cel, where volumes are reckoned."
            )
            raise RecordProblem(path, says, '"20.5"')


def _temperatures(record: BenchRecord) -> list[tuple[str, float]]:
    """Return every temperature of a liquid with its path."""
    flask = record.solution.flask if record.solution else None
    dose = record.back.dose if record.back else None
    found = [
        ("temperature.value", record.temperature.value if record.temperature else None),
        ("pipette.temperature", record.pipette.temperature if record.pipette else None),
        ("solution.flask.temperature", flask.temperature if flask else None),
        ("back.added.temperature", dose.temperature if dose else None),
    ]
    found += [
        (f"replicates[{i}].temperature", one.temperature) for i, one in enumerate(record.replicates)
    ]
    return [(path, value) for path, value in found if value is not None]


def _check_masses(top: Fields, record: BenchRecord) -> None:
    """Refuse loads outside the balance's error table, and a record in which nothing counts."""
    table = record.balance.error_table if record.balance else ()
    for i, one in enumerate(record.replicates):
        for path, load in one.loads:
            if table and not table[0][0] <= load <= table[-1][0]:
                says = (
                    f"{load:g} g lies outside the balance's error table, which goes from "
                    f"{table[0][0]:g} to {table[-1][0]:g} g."
                )
                raise RecordProblem(f"replicates[{i}].{path}", says, f'"{table[-1][0] / 2:g}"')
    if all(one.excluded is not None for one in record.replicates):
        top.refuse("replicates", "Every replicate is excluded: nothing is left to average.", None)
