"""The stores: standard lots and recipes, kept by a keeper."""

from dataclasses import dataclass
from datetime import date, datetime
from typing import Any
from uuid import uuid4

from sqlalchemy.orm import Session

from server.chemistry.formula import FormulaProblem, molar_mass
from server.chemistry.reactions import ratio
from server.chemistry.substances import SUBSTANCES
from server.intake.kept_files import read_original
from server.lab import reading_documents as reading
from server.lab.actor import Actor
from server.lab.calibration.drying_log import read_demand
from server.lab.calibration.standard_lot import after_period
from server.lab.free_text import read_text
from server.lab.people import check_name
from server.lab.recipe import RecipeDocument, read_recipe
from server.lab.refusal import SavedFirst, Unacceptable
from server.lab.roles import Act
from server.lab.validity import end_of_day, local_day, read_day
from server.procedures.acts import Thing, note_act
from server.procedures.files import keep_file
from server.records.queries.loading import newest_recipe_version, standard_lot_by_name
from server.records.tables.stores import Recipe, StandardLot

_BASES = ("as is", "dried")
#: What states the uncertainty of a quantity, one of them.
_UNCERTAINTIES = frozenset({"u", "U", "half_width"})
#: An assay may come out a little above one.
_MOST_FRACTION = 1.05


@dataclass(frozen=True, slots=True)
class ReceiveStandardLot:
    """A delivery of a primary standard with what its certificate states.

    ``mass_fraction``, ``molar_mass`` (g/mol) and ``density`` (g/cm3) are quantities as in a bench
    record; days are written year-month-day. ``due_on`` is the certificate's own end; the period
    after opening (``12 months``) and the re-test day are further rules, and the earliest counts.
    ``drying_demand`` is what ``server.lab.calibration.drying_log`` reads. ``content_base64`` is the
    certificate's file, kept with its SHA-256.
    """

    name: str
    substance: str
    certificate_number: str
    issuer: str
    due_on: str
    due_basis: str
    mass_fraction: dict[str, Any]
    basis: str = "as is"
    drying: str = ""
    molar_mass: dict[str, Any] | None = None
    density: dict[str, Any] | None = None
    minimum_sample_g: str = ""
    storage: str = ""
    received_g: str = ""
    received_on: str = ""
    period_after_opening: str = ""
    retest_on: str = ""
    drying_demand: dict[str, Any] | None = None
    file_name: str = ""
    content_base64: str = ""


@dataclass(frozen=True, slots=True)
class WriteRecipe:
    """A recipe, or a new version where the name exists.

    ``version`` is the newest version that the writer has seen (0: a new recipe).
    """

    name: str
    document: dict[str, Any]
    version: int = 0


def receive_standard_lot(
    session: Session, command: ReceiveStandardLot, *, actor: Actor, now: datetime
) -> str:
    """Keep a standard lot; return its id.

    Raises:
        Unacceptable: a statement that cannot be taken, or a due day that is past.
    """
    actor.need(Act.KEEP)
    name = check_name(command.name, "name", example="KHP lot 2026-3")
    if standard_lot_by_name(session, name) is not None:
        raise Unacceptable(f"There is a standard lot “{name}” already.", field="name")
    due_at = end_of_day(read_day(command.due_on, "due_on"), actor.zone)
    if due_at <= now:
        raise Unacceptable("This standard lot's due day is past.", field="due_on")
    retest_on = read_day(command.retest_on, "retest_on") if command.retest_on.strip() else None
    if retest_on is not None and end_of_day(retest_on, actor.zone) <= now:
        raise Unacceptable("This standard lot's re-test day is past.", field="retest_on")
    substance = check_name(command.substance, "substance", example="KHP")
    if command.molar_mass is None:
        _need_formula(substance)
    original = None
    if command.content_base64 or command.file_name:
        original = read_original(command.file_name, command.content_base64)
    row = StandardLot(
        id=str(uuid4()),
        name=name,
        substance=substance,
        certificate_number=check_name(
            command.certificate_number, "certificate_number", example="RM-1184"
        ),
        issuer=check_name(command.issuer, "issuer", example="producer of the standard"),
        due_at=due_at,
        due_basis=check_name(command.due_basis, "due_basis", example="expiry on the certificate"),
        document=_statements(command) | _in_the_store(command, today=local_day(now, actor.zone)),
        file_id=keep_file(session, original, actor=actor, now=now) if original else None,
        made_by=actor.person_id,
        made_at=now,
    )
    session.add(row)
    session.flush()
    thing = Thing("standard lot", row.id, row.name)
    body = {"substance": row.substance, "due_on": command.due_on, **row.document}
    if original is not None:
        body["file"] = {"id": row.file_id, "name": original.name, "sha256": original.sha256}
    note_act(session, "received a standard lot", thing, actor=actor, now=now, body=body)
    return row.id


def write_recipe(session: Session, command: WriteRecipe, *, actor: Actor, now: datetime) -> str:
    """Write a recipe as a new version; return the version's id.

    Raises:
        SavedFirst: somebody else wrote a newer version meanwhile.
        Unacceptable: the document cannot be taken.
    """
    actor.need(Act.KEEP)
    name = check_name(command.name, "name", example="NaOH against KHP")
    recipe = read_recipe(command.document)
    _need_ratio(recipe)
    newest = newest_recipe_version(session, name)
    if command.version != newest:
        says = (
            f"“{name}” has version {newest} by now; look at it and write from there."
            if newest
            else f"There is no recipe “{name}” yet."
        )
        raise SavedFirst(says, field="version", shown={"standing": {"version": newest}})
    row = Recipe(
        id=str(uuid4()),
        name=name,
        version=newest + 1,
        titrant=recipe.titrant.substance,
        standard=recipe.standard,
        document=command.document,
        made_by=actor.person_id,
        made_at=now,
    )
    session.add(row)
    session.flush()
    thing = Thing("recipe", row.id, f"{name}, version {row.version}")
    note_act(session, "wrote a recipe", thing, actor=actor, now=now, body=command.document)
    return row.id


def _need_formula(substance: str) -> None:
    """Refuse a substance whose molar mass neither a table nor its formula tells."""
    known = SUBSTANCES.get(substance)
    try:
        molar_mass(known.formula if known else substance)
    except FormulaProblem as problem:
        says = f"The molar mass of {substance} is in no table, and it is no formula: state it."
        example = '{"value": "204.2212", "unit": "g/mol", "u": "0.0038"}'
        raise Unacceptable(says, field="molar_mass", example=example) from problem


def _need_ratio(recipe: RecipeDocument) -> None:
    if recipe.ratio is None and ratio(recipe.titrant.substance, recipe.standard) is None:
        says = (
            f"No reaction of {recipe.titrant.substance} with {recipe.standard} is known here: "
            "state ratio, the amount of titrant per amount of standard."
        )
        raise Unacceptable(says, field="ratio", example="2/5")


def _statements(command: ReceiveStandardLot) -> dict[str, Any]:
    given: dict[str, Any] = {
        "mass_fraction": command.mass_fraction,
        "molar_mass": command.molar_mass,
        "density": command.density,
        "minimum_sample_g": command.minimum_sample_g or None,
    }
    units = {"mass_fraction": None, "molar_mass": "g/mol", "density": "g/cm3"}
    read: dict[str, Any] = {
        key: reading.positive_at(given, key, "", unit=unit) for key, unit in units.items()
    }
    if read["mass_fraction"] is None:
        says = "mass_fraction is missing."
        example = '{"value": "0.9998", "U": "0.0004", "k": "2"}'
        raise Unacceptable(says, field="mass_fraction", example=example)
    if float(read["mass_fraction"]["value"]) > _MOST_FRACTION:
        says = "mass_fraction is a part of one, not of a hundred."
        raise Unacceptable(says, field="mass_fraction", example="0.9998")
    if not _UNCERTAINTIES & read["mass_fraction"].keys():
        says = "mass_fraction states no uncertainty: give u, U with k, or a bound with its shape."
        raise Unacceptable(says, field="mass_fraction.U", example="0.0004")
    if command.basis not in _BASES:
        says = f"basis is one of {', '.join(_BASES)}."
        raise Unacceptable(says, field="basis", example="as is")
    read["basis"] = command.basis
    read["drying"] = read_text(command.drying, "drying") or None
    read["storage"] = read_text(command.storage, "storage") or None
    if command.minimum_sample_g:
        read["minimum_sample_g"] = _grams(command.minimum_sample_g, "minimum_sample_g")
    return {key: value for key, value in read.items() if value is not None}


def _in_the_store(command: ReceiveStandardLot, *, today: date) -> dict[str, Any]:
    """Return what the laboratory adds to a certificate: how much came, when, rules of its end."""
    read: dict[str, Any] = {}
    if command.received_g:
        read["received_g"] = _grams(command.received_g, "received_g")
    if command.received_on.strip():
        day = read_day(command.received_on, "received_on")
        if day > today:
            raise Unacceptable("This day lies in the future.", field="received_on")
        read["received_on"] = day.isoformat()
    period = command.period_after_opening.strip()
    if period:
        after_period(today, period)
        read["period_after_opening"] = period
    if command.retest_on.strip():
        read["retest_on"] = read_day(command.retest_on, "retest_on").isoformat()
    if command.drying_demand:
        read_demand(command.drying_demand)
        read["drying_demand"] = command.drying_demand
    return read


def _grams(text: str, field: str) -> str:
    reading.positive_at({field: {"value": text, "unit": "g"}}, field, "", unit="g")
    return text
