"""The bench's start: open sheets, lots to standardize, and what a new sheet will rest on."""

from collections.abc import Iterable, Sequence
from datetime import datetime
from decimal import Decimal
from fractions import Fraction

from sqlalchemy.orm import Session

from server.chemistry.cautions import DEFERRAL
from server.evaluation.mass_window import mass_window
from server.lab.actor import Actor
from server.lab.in_use import judge
from server.lab.recipe import RecipeDocument, read_recipe
from server.lab.refusal import NotAllowed
from server.lab.rig import rig_of
from server.lab.roles import Act
from server.lab.sheet_facts import (
    BALANCE,
    BURETTE,
    ROOM,
    THERMOMETER,
    InstrumentFact,
    StandardLotFact,
)
from server.lab.slots import replicate_rows, sheet_rows
from server.lab.states import IN_DATE
from server.metrology.rounding import significant
from server.records.queries.list_sheets import open_sheets, sheets_written_on
from server.records.queries.list_shelf import LotOnShelf, all_lots
from server.records.queries.list_stores import (
    ListedInstrument,
    listed_instruments,
    newest_recipes,
)
from server.records.queries.load_lots import lot_is_pulled
from server.records.queries.load_standard_lots import standard_lot_facts
from server.records.tables.lots import Lot
from server.records.tables.stores import Recipe
from server.sheets.bench import BeginPage, BenchHome, Choice
from server.sheets.parts.by_code import find_lot
from server.sheets.parts.doors import need_reader
from server.sheets.parts.roots import caution_views
from server.sheets.parts.sheet_lines import lot_words, sheet_line, sheet_title
from server.sheets.parts.shelf_state import state_of_lot
from server.sheets.parts.telling import last_day_words, quantity_words

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
    shelf = _Offered(session, recipe, now, reader.zone)
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
        mass_window=shelf.mass_window(),
        asked=shelf.asked(),
        cautions=caution_views((lot.titrant, recipe.standard)),
        deferral=DEFERRAL,
        may_override=may_override,
    )


class _Offered:
    """What a recipe may rest on now, in date first."""

    def __init__(self, session: Session, recipe: RecipeDocument, now: datetime, zone: str) -> None:
        self._recipe, self._now, self._zone = recipe, now, zone
        self._instruments = listed_instruments(session)
        lots = standard_lot_facts(session, substance=recipe.standard)
        self.standard_lots = _usable_first(self._standard_lot(one) for one in lots)

    def of_kind(self, kind: str) -> tuple[Choice, ...]:
        """Return the instruments of a kind."""
        found = (one for one in self._instruments if one.instrument.kind == kind)
        return _usable_first(self._instrument(one) for one in found)

    def mass_window(self) -> str:
        """Return the masses that use the proposed burette well, empty where nobody can tell."""
        recipe, burette = self._recipe, self._proposed(BURETTE)
        capacity = rig_of([burette]).burette if burette else None
        if capacity is None or burette is None:
            return ""
        window = mass_window(
            recipe.titrant.substance,
            recipe.standard,
            nominal_mol_L=float(recipe.titrant.nominal),
            capacity_mL=float(capacity.high),
            ratio=Fraction(recipe.ratio) if recipe.ratio else None,
        )
        if window is None:
            return ""
        low, high = significant(window.low_g, 3), significant(window.high_g, 3)
        return (
            f"{low} to {high} g of {recipe.standard} for 60 to 90 % of {burette.name} "
            f"({capacity.high} mL)"
        )

    def asked(self) -> tuple[str, ...]:
        """Return the rows that the sheet will ask for, each once."""
        proposed = [self._proposed(kind) for kind in (BALANCE, BURETTE, THERMOMETER, ROOM)]
        rig = rig_of([one for one in proposed if one is not None])
        rows = (*sheet_rows(self._recipe, rig), *replicate_rows(self._recipe, rig, 1))
        return tuple(dict.fromkeys(row.label for row in rows if row.required))

    def _proposed(self, kind: str) -> InstrumentFact | None:
        """Return the instrument that the page picks by itself: the first that is in date."""
        first = next((one for one in self.of_kind(kind) if one.refused is None), None)
        facts = (one.fact for one in self._instruments if first and one.instrument.id == first.id)
        return next(facts, None)

    def _standard_lot(self, one: StandardLotFact) -> Choice:
        fraction = quantity_words(one.document.get("mass_fraction"))
        drying = one.document.get("drying")
        good = f"good until {last_day_words(one.due_at, self._zone)}"
        says = ", ".join(part for part in (f"mass fraction {fraction}", drying, good) if part)
        return Choice(one.id, one.name, says, self._refused(one, "certificate"))

    def _instrument(self, one: ListedInstrument) -> Choice:
        row, fact = one.instrument, one.fact
        if fact is None:
            refused = "It has no calibration yet; a keeper records one."
            return Choice(row.id, row.name, row.document.get("type", ""), refused)
        about = (row.document.get("type"), row.document.get("location"))
        due = f"calibrated until {last_day_words(fact.due_at, self._zone)}"
        says = ", ".join(part for part in (*about, due) if part)
        return Choice(row.id, row.name, says, self._refused(fact, "calibration"))

    def _refused(self, thing: StandardLotFact | InstrumentFact, what: str) -> str | None:
        state, says = judge(
            thing.name, due_at=thing.due_at, basis=thing.due_basis, holds=thing.holds,
            used_at=self._now, zone=self._zone, what=what,
        )  # fmt: skip
        return None if state == IN_DATE else says


def _usable_first(choices: Iterable[Choice]) -> tuple[Choice, ...]:
    return tuple(sorted(choices, key=lambda one: one.refused is not None))


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
