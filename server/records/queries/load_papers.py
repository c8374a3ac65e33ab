"""People, the laboratory, and the papers that a sheet rests on, one by one."""

from collections.abc import Iterable

from sqlalchemy.orm import Session

from server.lab.recipe import read_recipe
from server.lab.refusal import NotFound
from server.lab.sheet_facts import (
    HoldFact,
    InstrumentFact,
    LaboratoryFact,
    PersonFact,
    RecipeFact,
)
from server.records.queries.by_ids import IDS, rows_by
from server.records.queries.list_stores import instrument_fact
from server.records.queries.loading import holds_of, laboratory_row
from server.records.tables.people import Person
from server.records.tables.stores import Calibration, Instrument, Recipe

_PEOPLE = rows_by(Person.id)


def load_people(session: Session, ids: Iterable[str]) -> dict[str, PersonFact]:
    """Return people by id."""
    rows = session.scalars(_PEOPLE, {IDS: list(set(ids))})
    return {row.id: PersonFact(row.id, row.printed_name, row.initials) for row in rows}


def load_laboratory_fact(session: Session) -> LaboratoryFact:
    """Return the laboratory and its settings."""
    row = laboratory_row(session)
    return LaboratoryFact(row.name, row.address, row.zone, row.settings, row.own_signature)


def load_recipe_fact(session: Session, recipe_id: str) -> RecipeFact:
    """Return one version of a recipe.

    Raises:
        NotFound: there is no such recipe.
    """
    row = session.get(Recipe, recipe_id)
    if row is None:
        raise NotFound("There is no such recipe.", field="recipe_id")
    return RecipeFact(row.id, row.name, row.version, read_recipe(row.document))


def load_instrument_fact(session: Session, calibration_id: str) -> InstrumentFact:
    """Return an instrument with one version of its calibration."""
    calibration = session.get_one(Calibration, calibration_id)
    instrument = session.get_one(Instrument, calibration.instrument_id)
    return instrument_fact(instrument, calibration, _holds(session, "instrument", instrument.id))


def _holds(session: Session, kind: str, thing_id: str) -> tuple[HoldFact, ...]:
    rows = holds_of(session, kind, thing_id)
    return tuple(HoldFact(row.held_at, row.released_at, row.reason) for row in rows)
