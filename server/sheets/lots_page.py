"""All titrant lots, with what is in force of each."""

from dataclasses import dataclass
from datetime import datetime

from sqlalchemy.orm import Session

from server.lab.actor import Actor
from server.lab.states import LOT_STATES, may_be_used
from server.records.queries.list_shelf import LotOnShelf, all_lots, bottles_by_lot
from server.records.queries.load_papers import load_people
from server.sheets.parts.doors import need_reader
from server.sheets.parts.shelf_state import concentration_in_force, nominal_words, state_of_lot
from server.sheets.parts.telling import count_words, due_words, last_day_words, moment_words


@dataclass(frozen=True, slots=True)
class LotLine:
    """A lot in the list; ``reported`` is empty where it is not in force."""

    code: str
    url: str
    name: str
    titrant: str
    nominal: str
    medium: str
    state: str
    reported: str
    good_until: str
    due_in: str
    certificate: str
    bottles: int
    made: str
    made_at: str
    made_by: str


@dataclass(frozen=True, slots=True)
class Lots:
    """The lots, due soonest first; ``states`` and ``titrants`` are those to filter by."""

    lots: tuple[LotLine, ...]
    says: str
    states: tuple[str, ...]
    state: str
    titrants: tuple[str, ...]
    titrant: str
    may_make_up: bool


def open_lots(
    session: Session, *, state: str, actor: Actor | None, now: datetime, titrant: str = ""
) -> Lots:
    """Return all lots, or those in a state or of a titrant: due soonest first, then the unproven.

    Raises:
        NotSignedIn: a visitor.
    """
    reader = need_reader(actor)
    every = sorted(all_lots(session), key=lambda one: _soonest(one, now))
    people = load_people(session, {one.lot.made_by for one in every})
    bottles = bottles_by_lot(session)
    lines = [
        _line(
            one, now, reader.zone,
            made_by=people[one.lot.made_by].printed_name,
            bottles=bottles.get(one.lot.id, 0),
        )
        for one in every
    ]  # fmt: skip
    shown = tuple(one for one in lines if state in {"", one.state} and titrant in {"", one.titrant})
    return Lots(
        lots=shown,
        says=f"{count_words(len(shown), 'lot')}, due soonest first.",
        states=LOT_STATES,
        state=state if state in LOT_STATES else "",
        titrants=tuple(sorted({one.titrant for one in lines})),
        titrant=titrant,
        may_make_up="analyst" in reader.roles,
    )


def _soonest(one: LotOnShelf, now: datetime) -> tuple[int, float]:
    """Sort lots in force by their end, then those without a number as they were made, last first.

    ``all_lots`` gives them made up last first, and the sort keeps that order.
    """
    state = one.state(now)
    if may_be_used(state) and one.certificate is not None:
        return 0, one.certificate.row.valid_until.timestamp()
    return LOT_STATES.index(state), 0.0


def _line(one: LotOnShelf, now: datetime, zone: str, *, made_by: str, bottles: int) -> LotLine:
    lot, state = one.lot, state_of_lot(one, now)
    result = concentration_in_force(one, state)
    row = one.certificate.row if one.certificate else None
    return LotLine(
        code=lot.code,
        url=f"/lots/{lot.code}",
        name=lot.name,
        titrant=lot.titrant,
        nominal=nominal_words(lot.nominal),
        medium=lot.medium,
        state=state,
        reported=result["concentration"]["reported"] if result else "",
        good_until=last_day_words(row.valid_until, zone) if row else "",
        due_in=due_words(row.valid_until, now, zone) if row else "",
        certificate=row.number if row else "",
        bottles=bottles,
        made=moment_words(lot.made_at, zone),
        made_at=lot.made_at.isoformat(),
        made_by=made_by,
    )
