"""The bench's start: open sheets, lots to standardize, and what a new sheet will rest on."""

from collections.abc import Iterable, Sequence
from datetime import datetime
from decimal import Decimal

from sqlalchemy.orm import Session

from server.chemistry.cautions import DEFERRAL
from server.lab.actor import Actor
from server.lab.recipe import read_recipe
from server.lab.refusal import NotAllowed
from server.lab.roles import Act
from server.lab.sheet_facts import BALANCE, BURETTE, PROBE, ROOM, THERMOMETER
from server.records.queries.list_sheets import open_sheets, sheets_written_on
from server.records.queries.list_shelf import LotOnShelf, all_lots
from server.records.queries.list_stores import newest_recipes
from server.records.queries.load_lots import lot_is_pulled
from server.records.tables.lots import Lot
from server.records.tables.stores import Recipe
from server.sheets.bench import BeginPage, BenchHome, Choice
from server.sheets.parts.by_code import find_lot
from server.sheets.parts.doors import need_reader
from server.sheets.parts.offered import Offered
from server.sheets.parts.planned import plan_view, planned_with
from server.sheets.parts.roots import caution_views
from server.sheets.parts.sheet_lines import lot_words, sheet_line, sheet_title
from server.sheets.parts.shelf_state import state_of_lot

_NOT_HERE = "Sheets by aliquot or against a titrant are not written here yet."


def open_bench_home(session: Session, *, actor: Actor | None, now: datetime) -> BenchHome:
    """Return one's own open sheets, those of others, and the lots that can be standardized.

    Raises:
        NotSignedIn: a visitor.
    """
    reader = need_reader(actor)
    listed = open_sheets(session)
    own = sheets_written_on(session, [one.sheet.id for one in listed], reader.person_id)
    own |= {one.sheet.id for one in listed if one.sheet.begun_by == reader.person_id}
    may_begin = reader.may(Act.WRITE) or reader.may(Act.OVERRIDE)
    return BenchHome(
        mine=tuple(sheet_line(one, reader.zone) for one in listed if one.sheet.id in own),
        others=tuple(sheet_line(one, reader.zone) for one in listed if one.sheet.id not in own),
        lots=tuple(_lot_choices(session, now)) if may_begin else (),
        may_begin=may_begin,
    )


def open_begin(
    session: Session, lot_code: str, *, recipe_id: str | None, actor: Actor | None, now: datetime
) -> BeginPage:
    """Return what a new sheet of a lot will rest on; what cannot be used says why.

    Raises:
        NotFound: no lot has this code; ``shown["nearest"]`` holds codes close to it.
        NotSignedIn: a visitor.
        NotAllowed: somebody who may not begin a sheet, a lot that was pulled or has no recipe.
    """
    reader = need_reader(actor)
    may_override = reader.may(Act.OVERRIDE)
    if not may_override:
        reader.need(Act.WRITE)
    lot = find_lot(session, lot_code, field="lot_code")
    if lot_is_pulled(session, lot.id):
        raise NotAllowed("This lot was pulled: it is out of use for good.", field="lot_code")
    recipes = [one for one in newest_recipes(session) if _fits(one, lot)]
    if not recipes:
        says = f"No recipe fits {lot_words(lot)} in {lot.medium}; a keeper writes one."
        raise NotAllowed(says, field="recipe_id")
    chosen = _chosen(recipes, recipe_id)
    recipe = read_recipe(chosen.document)
    shelf = Offered(session, recipe, now, reader.zone)
    planned = plan_view(planned_with(session, shelf.materials(), recipe, recipe_name=chosen.name))
    return BeginPage(
        lot_code=lot.code,
        lot_name=lot.name,
        title=sheet_title(lot.titrant, lot.nominal),
        recipes=tuple(_recipe_choice(one) for one in recipes),
        recipe_id=chosen.id,
        standard_lots=shelf.standard_lots,
        balances=shelf.of_kind(BALANCE),
        burettes=shelf.of_kind(BURETTE),
        thermometers=shelf.of_kind(THERMOMETER),
        rooms=shelf.of_kind(ROOM) if recipe.buoyancy else (),
        probes=shelf.of_kind(PROBE) if recipe.end_point.mode == "potentiometric" else (),
        mass_window=planned.window,
        plan=planned,
        plan_url=shelf.plan_url(chosen.id),
        asked=shelf.asked(),
        cautions=caution_views((lot.titrant, recipe.standard)),
        deferral=DEFERRAL,
        may_override=may_override,
    )


def _lot_choices(session: Session, now: datetime) -> Iterable[Choice]:
    """Yield the lots that are not pulled and have a recipe; the newest first."""
    recipes = newest_recipes(session)
    for one in all_lots(session):
        if one.pulled:
            continue
        refused = None
        if not any(_fits(recipe, one.lot) for recipe in recipes):
            refused = "No recipe fits this titrant; a keeper writes one."
        yield Choice(one.lot.code, one.lot.name, _about(one, now), refused)


def _about(one: LotOnShelf, now: datetime) -> str:
    return f"{lot_words(one.lot)}, {one.lot.code}, {state_of_lot(one, now)}"


def _fits(row: Recipe, lot: Lot) -> bool:
    titrant = read_recipe(row.document).titrant
    return (
        titrant.substance == lot.titrant
        and titrant.medium == lot.medium
        and Decimal(titrant.nominal) == Decimal(lot.nominal)
    )


def _chosen(recipes: Sequence[Recipe], recipe_id: str | None) -> Recipe:
    """Return the recipe asked for, else the first that can be written here."""
    ordered = sorted(recipes, key=lambda one: (one.id != recipe_id, _refused_recipe(one) or ""))
    return ordered[0]


def _refused_recipe(row: Recipe) -> str | None:
    return None if read_recipe(row.document).route == "weighed" else _NOT_HERE


def _recipe_choice(row: Recipe) -> Choice:
    title = read_recipe(row.document).title
    return Choice(row.id, f"{row.name}, version {row.version}", title, _refused_recipe(row))
