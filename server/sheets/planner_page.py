"""The planner: pick, read, and let the arithmetic wait until nothing is open."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from datetime import datetime

from sqlalchemy.orm import Session

from server.lab.actor import Actor
from server.lab.calibration.typed_numbers import read_number
from server.lab.recipe import read_recipe
from server.lab.refusal import NotAllowed, Unacceptable
from server.lab.sheet_facts import BALANCE, BURETTE, ROOM, THERMOMETER
from server.records.queries.list_stores import newest_recipes
from server.records.tables.stores import Recipe
from server.sheets.bench import Choice
from server.sheets.parts.doors import need_reader
from server.sheets.parts.offered import FIELDS, Offered
from server.sheets.parts.planned import ToPlan, plan_view, planned_with
from server.sheets.planner import PickList, PlannerPage

_LABELS = {
    BALANCE: "Balance",
    BURETTE: "Burette",
    THERMOMETER: "Thermometer",
    ROOM: "Room monitor",
}


@dataclass(frozen=True, slots=True)
class PlanAsked:
    """What somebody wants planned, as typed; what is empty is proposed.

    ``mass_g`` is what will be weighed, ``wanted_percent`` the U wanted in percent of c.
    """

    recipe_id: str = ""
    standard_lot_id: str = ""
    balance_id: str = ""
    burette_id: str = ""
    thermometer_id: str = ""
    room_id: str = ""
    replicates: str = ""
    mass_g: str = ""
    wanted_percent: str = ""


@dataclass(frozen=True, slots=True)
class ReadyToPlan:
    """What was picked and read; ``finish`` makes the page of it with nothing open."""

    picks: tuple[PickList, ...]
    asked: PlanAsked
    to_plan: ToPlan

    def finish(self) -> PlannerPage:
        """Return the planner with its plan.

        Raises:
            Unacceptable: the mass asked for is none that this burette can titrate.
        """
        try:
            plan = plan_view(self.to_plan)
        except Unacceptable as problem:
            raise Unacceptable(problem.says, field="mass_g", example=problem.example) from problem
        used = self.to_plan.replicates or (
            self.to_plan.materials.replicates_wanted if self.to_plan.materials else 3
        )
        return PlannerPage(
            picks=self.picks,
            replicates=str(used),
            mass_g=self.asked.mass_g,
            wanted_percent=self.asked.wanted_percent,
            plan=plan,
        )


def open_planner(
    session: Session, asked: PlanAsked, *, actor: Actor | None, now: datetime
) -> ReadyToPlan:
    """Return what a plan is made of, ready for its arithmetic.

    Raises:
        NotSignedIn: a visitor.
        NotAllowed: there is no recipe yet.
        Unacceptable: a number that cannot be.
    """
    reader = need_reader(actor)
    recipes = newest_recipes(session)
    if not recipes:
        raise NotAllowed("There is no recipe yet; a keeper writes one.", field="recipe_id")
    chosen = _chosen(recipes, asked.recipe_id)
    recipe = read_recipe(chosen.document)
    picked = {name: getattr(asked, name) for name in ("standard_lot_id", *FIELDS.values())}
    shelf = Offered(session, recipe, now, reader.zone, picked=picked)
    to_plan = planned_with(session, shelf.materials(), recipe, recipe_name=chosen.name)
    return ReadyToPlan(
        picks=tuple(_picks(recipes, chosen, shelf)),
        asked=asked,
        to_plan=replace(
            to_plan,
            replicates=_replicates(asked.replicates),
            mass_g=_number(asked.mass_g, "mass_g", "0.4", most="1000"),
            wanted_percent=_number(asked.wanted_percent, "wanted_percent", "0.15", most="100"),
        ),
    )


def _chosen(recipes: Sequence[Recipe], recipe_id: str) -> Recipe:
    """Return the recipe asked for, else the first that weighs a standard."""
    return min(
        recipes,
        key=lambda one: (one.id != recipe_id, read_recipe(one.document).route != "weighed"),
    )


def _picks(recipes: Sequence[Recipe], chosen: Recipe, shelf: Offered) -> list[PickList]:
    named = tuple(
        Choice(one.id, f"{one.name}, version {one.version}", read_recipe(one.document).title, None)
        for one in recipes
    )
    used: Mapping[str, str] = shelf.picks()
    lists = [
        PickList("recipe_id", "Recipe", named, chosen.id),
        PickList(
            "standard_lot_id", "Standard lot", shelf.standard_lots, used.get("standard_lot_id", "")
        ),
    ]
    for kind in shelf.kinds():
        field = FIELDS[kind]
        lists.append(PickList(field, _LABELS[kind], shelf.of_kind(kind), used.get(field, "")))
    return lists


def _replicates(text: str) -> int | None:
    if not text.strip():
        return None
    if not (text.strip().isascii() and text.strip().isdigit() and 1 <= int(text[:9]) <= 20):
        says = "replicates must be a whole number from 1 to 20."
        raise Unacceptable(says, field="replicates", example="4")
    return int(text)


def _number(text: str, field: str, example: str, *, most: str) -> float | None:
    if not text.strip():
        return None
    typed = text.strip().replace(",", ".") if "." not in text else text
    number = read_number(typed, field, example=example, low="0", high=most)
    if number == 0:
        raise Unacceptable(f"{field} must be above zero.", field=field, example=example)
    return float(number)
