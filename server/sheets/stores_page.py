"""The stores: standard lots and recipes, and one of each."""

from collections.abc import Iterable, Mapping, Sequence
from datetime import datetime
from typing import Any

from sqlalchemy.orm import Session

from server.evaluation.from_sheet import limits_of
from server.lab.actor import Actor
from server.lab.limits import LIMITS
from server.lab.recipe import RecipeDocument, read_recipe
from server.lab.refusal import NotFound
from server.lab.roles import Act
from server.lab.sheet_facts import STANDARD_LOT, StandardLotFact
from server.lab.states import DUE_SOON, HELD, IN_DATE, LAPSED, due_state
from server.records.queries.list_holds import standing_holds
from server.records.queries.list_sheets import sheets_on_standard_lot
from server.records.queries.list_stores import newest_recipes, recipe_versions, standard_lot_facts
from server.records.queries.load_papers import (
    load_laboratory_fact,
    load_people,
    load_standard_lot_fact,
)
from server.records.tables.stores import Recipe, StandardLot
from server.sheets.parts.doors import may_hold, may_release, need_reader
from server.sheets.parts.shelf_state import held_says, nominal_words
from server.sheets.parts.telling import (
    count_words,
    last_day_words,
    moment_words,
    quantity_words,
)
from server.sheets.stores import (
    Fact,
    RecipeLine,
    RecipePage,
    StandardLotPage,
    StoreLine,
    Stores,
)

_ORDER = (DUE_SOON, IN_DATE, HELD, LAPSED)


def open_stores(session: Session, *, actor: Actor | None, now: datetime) -> Stores:
    """Return the standard lots by state and the newest version of each recipe.

    Raises:
        NotSignedIn: a visitor.
    """
    reader = need_reader(actor)
    lines = [_line(one, now, reader.zone) for one in standard_lot_facts(session)]
    return Stores(
        standard_lots=tuple(sorted(lines, key=lambda line: _ORDER.index(line.state))),
        recipes=tuple(_recipe_line(one) for one in newest_recipes(session)),
        may_keep=reader.may(Act.KEEP),
    )


def open_standard_lot(
    session: Session, standard_lot_id: str, *, actor: Actor | None, now: datetime
) -> StandardLotPage:
    """Return one standard lot: what its certificate states, and where it was used.

    Raises:
        NotFound: there is no such standard lot.
        NotSignedIn: a visitor.
    """
    reader = need_reader(actor)
    one = load_standard_lot_fact(session, standard_lot_id)
    row = session.get_one(StandardLot, one.id)
    hold = standing_holds(session, (STANDARD_LOT,), thing_ids=(one.id,)).get((STANDARD_LOT, one.id))
    by = load_people(session, (row.made_by,))[row.made_by].printed_name
    received = Fact("Received", f"{moment_words(row.made_at, reader.zone)} by {by}")
    return StandardLotPage(
        id=one.id,
        name=one.name.removeprefix(f"{one.substance}, lot "),
        substance=one.substance,
        state=_state(one, now),
        held_says=held_says(hold, STANDARD_LOT, reader.zone),
        facts=(*_stated(one, reader.zone), received),
        sheets=tuple(
            (sheet.number, f"/bench/{sheet.id}")
            for sheet in sheets_on_standard_lot(session, one.id)
        ),
        may_keep=reader.may(Act.KEEP),
        may_hold=may_hold(reader, hold),
        may_release=may_release(reader, hold),
    )


def open_recipe(
    session: Session, recipe_id: str, *, actor: Actor | None, now: datetime
) -> RecipePage:
    """Return one version of a recipe with its limits and what they rest on.

    Raises:
        NotFound: there is no such recipe.
        NotSignedIn: a visitor.
    """
    del now
    reader = need_reader(actor)
    row = session.get(Recipe, recipe_id)
    if row is None:
        raise NotFound("There is no such recipe.", field="recipe_id")
    recipe = _read(row)
    by = load_people(session, (row.made_by,))[row.made_by].printed_name
    written = Fact("Written", f"{moment_words(row.made_at, reader.zone)} by {by}")
    laboratory = load_laboratory_fact(session)
    return RecipePage(
        id=row.id,
        name=row.name,
        version=row.version,
        facts=(*_fixed(recipe), written),
        steps=tuple(
            f"{step.label}{', for every replicate' if step.when == 'replicate' else ''}"
            for step in recipe.steps
        ),
        limits=_limits(laboratory.settings.get("limits") or {}, recipe),
        versions=tuple(
            (one.version, f"/stores/recipes/{one.id}") for one in recipe_versions(session, row.name)
        ),
        may_keep=reader.may(Act.KEEP),
    )


def _state(one: StandardLotFact, now: datetime) -> str:
    held = any(hold.released_at is None for hold in one.holds)
    return due_state(due_at=one.due_at, held=held, now=now)


def _line(one: StandardLotFact, now: datetime, zone: str) -> StoreLine:
    return StoreLine(
        id=one.id,
        url=f"/stores/standard-lots/{one.id}",
        kind=one.substance,
        name=one.name,
        says=f"mass fraction {quantity_words(one.document.get('mass_fraction'))}",
        state=_state(one, now),
        due=last_day_words(one.due_at, zone),
        certificate=one.certificate_number,
    )


def _recipe_line(row: Recipe) -> RecipeLine:
    recipe = _read(row)
    return RecipeLine(
        id=row.id,
        url=f"/stores/recipes/{row.id}",
        name=row.name,
        version=row.version,
        titrant=f"{recipe.titrant.substance} {nominal_words(recipe.titrant.nominal)}",
        against=recipe.standard,
        says=recipe.title,
    )


def _stated(one: StandardLotFact, zone: str) -> Iterable[Fact]:
    held = one.document
    facts = (
        Fact("Substance", one.substance),
        Fact("Certificate", one.certificate_number),
        Fact("Issued by", one.issuer),
        Fact("Mass fraction", quantity_words(held.get("mass_fraction"))),
        Fact("Holds for the substance", str(held.get("basis", ""))),
        Fact("Drying", str(held.get("drying") or "")),
        Fact("Molar mass", quantity_words(held.get("molar_mass"))),
        Fact("Density", quantity_words(held.get("density"))),
        Fact("Smallest sample", _grams(held)),
        Fact("Storage", str(held.get("storage") or "")),
        Fact("Good until", f"{last_day_words(one.due_at, zone)} ({one.due_basis})"),
    )
    return (fact for fact in facts if fact.value)


def _grams(held: Mapping[str, Any]) -> str:
    return f"{held['minimum_sample_g']} g" if held.get("minimum_sample_g") else ""


def _fixed(recipe: RecipeDocument) -> Sequence[Fact]:
    titrant, air = recipe.titrant, "corrected, with air readings"
    facts = (
        Fact("Title", recipe.title),
        Fact("Titrant", f"{titrant.substance} {nominal_words(titrant.nominal)}, {titrant.medium}"),
        Fact("Against", recipe.standard),
        Fact("Route", recipe.route),
        Fact("Titrant per standard", recipe.ratio or "from the reaction"),
        Fact("Weighing", "by difference" if recipe.weighing == "difference" else recipe.weighing),
        Fact("Replicates", str(recipe.replicates)),
        Fact(
            "End point",
            ", ".join(filter(None, (recipe.end_point.mode, recipe.end_point.indicator))),
        ),
        Fact("Good for", recipe.valid_for),
        Fact("Blank", f"{recipe.blank} blank" if recipe.blank else "none"),
        Fact("Excess at the end point", quantity_words(recipe.excess)),
        Fact("Buoyancy", air if recipe.buoyancy else "not corrected"),
        Fact("Temperature of the titrant", _temperature(recipe)),
        Fact("Expansion of the liquid", quantity_words(recipe.liquid_expansion) or "as water"),
        Fact("Repeatability", _repeatability(recipe)),
        Fact("Certificate good for", count_words(recipe.interval_days, "day")),
        Fact("Notice before that", count_words(recipe.notice_days, "day")),
    )
    return tuple(fact for fact in facts if fact.value)


def _temperature(recipe: RecipeDocument) -> str:
    return "read once" if recipe.temperature == "once" else "read for every replicate"


def _repeatability(recipe: RecipeDocument) -> str:
    stated = recipe.repeatability
    if stated is None:
        return "from the replicates of each sheet"
    whose = "one replicate" if stated["applies_to"] == "one" else "the mean"
    parts = [f"relative u {stated['relative_u']} of {whose}"]
    if stated.get("dof"):
        parts.append(f"{stated['dof']} degrees of freedom")
    return ", ".join([*parts, *([stated["source"]] if stated.get("source") else [])])


def _limits(
    of_laboratory: Mapping[str, str], recipe: RecipeDocument
) -> tuple[tuple[str, str, str], ...]:
    """Return the limits that count, as they were typed, each with its basis."""
    limits = limits_of(of_laboratory, recipe.limits)
    typed = {**of_laboratory, **recipe.limits}
    return tuple(
        (known.label, f"{typed.get(name, known.default)} {known.unit}".strip(), limits.basis(name))
        for name, known in LIMITS.items()
    )


def _read(row: Recipe) -> RecipeDocument:
    return read_recipe(row.document)
