"""The stores: standard lots and recipes, and one recipe."""

from collections.abc import Mapping, Sequence
from datetime import datetime

from sqlalchemy.orm import Session

from server.evaluation.from_sheet import limits_of
from server.lab.actor import Actor
from server.lab.limits import LIMITS
from server.lab.lot_log import opened_on
from server.lab.lot_uses import is_counted, remaining_of, running_uses, taken_by_hand
from server.lab.recipe import RecipeDocument, read_recipe
from server.lab.refusal import NotFound
from server.lab.roles import Act
from server.lab.sheet_facts import StandardLotFact
from server.lab.states import DUE_SOON, HELD, IN_DATE, LAPSED
from server.records.queries.list_stores import newest_recipes, recipe_versions
from server.records.queries.list_uses import SheetOnLot, sheets_on_lots, taken_on_sheets
from server.records.queries.load_papers import load_laboratory_fact, load_people
from server.records.queries.load_standard_lots import standard_lot_facts
from server.records.tables.stores import Recipe
from server.sheets.parts.doors import need_reader
from server.sheets.parts.shelf_state import nominal_words
from server.sheets.parts.telling import (
    count_words,
    day_words,
    due_words,
    last_day_words,
    moment_words,
    quantity_words,
)
from server.sheets.standard_lot_page import state_of_standard_lot
from server.sheets.stores import Fact, RecipeLine, RecipePage, StandardLotLine, Stores

_ORDER = (DUE_SOON, IN_DATE, HELD, LAPSED)


def open_stores(session: Session, *, actor: Actor | None, now: datetime) -> Stores:
    """Return the standard lots by state and the newest version of each recipe.

    Raises:
        NotSignedIn: a visitor.
    """
    reader = need_reader(actor)
    lots = standard_lot_facts(session)
    sheets = sheets_on_lots(session, [one.id for one in lots if is_counted(one)])
    lines = [_line(one, sheets.get(one.id, ()), now, reader.zone) for one in lots]
    return Stores(
        standard_lots=tuple(sorted(lines, key=lambda line: _ORDER.index(line.state))),
        recipes=tuple(_recipe_line(one) for one in newest_recipes(session)),
        may_keep=reader.may(Act.KEEP),
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


def _line(
    one: StandardLotFact, sheets: Sequence[SheetOnLot], now: datetime, zone: str
) -> StandardLotLine:
    uses = running_uses(one.document, (*taken_on_sheets(sheets), *taken_by_hand(one.log)))
    remaining, opened = remaining_of(one.document, uses), opened_on(one.log)
    return StandardLotLine(
        id=one.id,
        url=f"/stores/standard-lots/{one.id}",
        kind=one.substance,
        name=one.name,
        says=f"mass fraction {quantity_words(one.document.get('mass_fraction'))}",
        state=state_of_standard_lot(one, now),
        due=last_day_words(one.due_at, zone),
        due_in=due_words(one.due_at, now, zone),
        due_rule=one.due_basis,
        certificate=one.certificate_number,
        issuer=one.issuer,
        opened=day_words(opened) if opened else "",
        left=f"{remaining.left_g} g" if remaining else "",
        left_verdict=remaining.check.verdict if remaining else "",
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
        *_end_point(recipe),
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


def _end_point(recipe: RecipeDocument) -> Sequence[Fact]:
    told = recipe.end_point
    if told.method is None:
        return (Fact("End point", ", ".join(filter(None, (told.mode, told.indicator)))),)
    flask = f"{told.flask_volume_mL} mL" if told.flask_volume_mL else "not stated"
    return (
        Fact("End point", f"{told.mode}: a curve for each replicate, taken by {told.method}"),
        Fact("Reaction on the curve", told.system or "by titrant and standard"),
        Fact("In the flask before the first drop", flask),
    )


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
