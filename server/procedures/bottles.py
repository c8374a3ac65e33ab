"""A bottle opened, or moved to another place."""

from dataclasses import dataclass
from datetime import datetime

from sqlalchemy.orm import Session

from server.lab.actor import Actor
from server.lab.codes import read_code
from server.lab.opened import opened_end
from server.lab.people import check_name
from server.lab.refusal import NotAllowed, NotFound
from server.lab.roles import Act
from server.lab.validity import last_day
from server.procedures.acts import Thing, note_act
from server.records.queries.load_lots import bottle_by_code
from server.records.tables.lots import Bottle, Lot


@dataclass(frozen=True, slots=True)
class OpenBottle:
    """A bottle whose seal is broken now."""

    code: str


@dataclass(frozen=True, slots=True)
class MoveBottle:
    """A bottle that stands somewhere else now."""

    code: str
    place: str


def open_bottle(session: Session, command: OpenBottle, *, actor: Actor, now: datetime) -> None:
    """Write down that a bottle was opened; doing it twice changes nothing.

    Where its lot limits how long an open bottle keeps, the bottle is good until then at most.
    """
    actor.need(Act.BOTTLE)
    bottle = known_bottle(session, command.code)
    if bottle.opened_at is not None:
        return
    _refuse_used_up(bottle)
    lot = session.get_one(Lot, bottle.lot_id)
    days = lot.document.get("opened_days")
    bottle.opened_at = now
    bottle.opened_by = actor.person_id
    bottle.opened_until = opened_end(now, int(days), actor.zone) if days else None
    session.flush()
    until = bottle.opened_until
    body = {"good until": last_day(until, actor.zone).isoformat()} if until else {}
    note_act(session, "opened a bottle", thing_of(bottle), actor=actor, now=now, body=body)


def move_bottle(session: Session, command: MoveBottle, *, actor: Actor, now: datetime) -> None:
    """Write down where a bottle stands now; the trail keeps where it stood."""
    actor.need(Act.BOTTLE)
    place = check_name(command.place, "place", example="Shelf 3")
    bottle = known_bottle(session, command.code)
    if place == bottle.place:
        return
    _refuse_used_up(bottle)
    body = {"from": bottle.place, "to": place}
    bottle.place = place
    session.flush()
    note_act(session, "moved a bottle", thing_of(bottle), actor=actor, now=now, body=body)


def known_bottle(session: Session, text: str) -> Bottle:
    """Return the bottle of a code, locked until the transaction ends.

    Raises:
        NotFound: no bottle has this code.
    """
    code = read_code(text)
    bottle = bottle_by_code(session, code)
    if bottle is None:
        raise NotFound(f"There is no bottle {code}.", field="code")
    session.refresh(bottle, with_for_update=True)
    return bottle


def thing_of(bottle: Bottle) -> Thing:
    """Return a bottle as the trail names it."""
    return Thing("bottle", bottle.id, bottle.code)


def _refuse_used_up(bottle: Bottle) -> None:
    if bottle.used_up_at is not None:
        raise NotAllowed("This bottle is used up.")
