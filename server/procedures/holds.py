"""Holding a thing that somebody doubts, and releasing it."""

from dataclasses import dataclass
from datetime import datetime
from uuid import uuid4

from sqlalchemy.orm import Session

from server.lab.actor import Actor
from server.lab.codes import read_code
from server.lab.free_text import read_reason
from server.lab.refusal import NotAllowed, NotFound, Unacceptable
from server.lab.roles import Act
from server.lab.segregation import release_refusal
from server.procedures.acts import Thing, note_act
from server.records.queries.load_lots import bottle_by_code, lot_of_code
from server.records.queries.loading import standing_hold
from server.records.tables.lots import Bottle, Lot
from server.records.tables.stores import Hold, Instrument, StandardLot

KINDS = ("lot", "bottle", "standard lot", "instrument")
_GIVE = "Give the reason."


@dataclass(frozen=True, slots=True)
class HoldThing:
    """A doubt. ``thing``: the code of a lot or bottle, the id of a standard lot or instrument."""

    kind: str
    thing: str
    reason: str


@dataclass(frozen=True, slots=True)
class ReleaseThing:
    """The end of a doubt, with the reason."""

    kind: str
    thing: str
    reason: str


def hold_thing(session: Session, command: HoldThing, *, actor: Actor, now: datetime) -> str:
    """Hold a thing: it is out of use until somebody else releases it; return the hold's id."""
    actor.need(Act.HOLD)
    thing = _thing(session, command.kind, command.thing)
    reason = read_reason(command.reason, says=_GIVE, example="cloudy, looks carbonated")
    standing = standing_hold(session, thing.kind, thing.id)
    if standing is not None:
        raise NotAllowed(f"{thing.name} is held already: {standing.reason}.")
    hold = Hold(
        id=str(uuid4()),
        kind=thing.kind,
        thing_id=thing.id,
        held_by=actor.person_id,
        held_at=now,
        reason=reason,
    )
    session.add(hold)
    session.flush()
    note_act(session, f"held a {thing.kind}", thing, actor=actor, now=now, why=reason)
    return hold.id


def release_thing(session: Session, command: ReleaseThing, *, actor: Actor, now: datetime) -> None:
    """Release what somebody else held."""
    actor.need(Act.RELEASE)
    thing = _thing(session, command.kind, command.thing)
    reason = read_reason(command.reason, says=_GIVE, example="filtered and checked, clear")
    hold = standing_hold(session, thing.kind, thing.id)
    if hold is None:
        raise NotAllowed(f"{thing.name} is not held.")
    refusal = release_refusal(hold.held_by, actor.person_id)
    if refusal:
        raise NotAllowed(refusal)
    hold.released_by = actor.person_id
    hold.released_at = now
    hold.release_reason = reason
    session.flush()
    note_act(session, f"released a {thing.kind}", thing, actor=actor, now=now, why=reason)


def _thing(session: Session, kind: str, key: str) -> Thing:
    if kind not in KINDS:
        says = f"kind cannot be “{kind[:40]}”; it is one of {', '.join(KINDS)}."
        raise Unacceptable(says, field="kind", example="bottle")
    row = _row(session, kind, key)
    if row is None:
        raise NotFound(f"There is no such {kind}.", field="thing")
    session.refresh(row, with_for_update=True)  # of two who hold it at once the second is told
    return Thing(kind, row.id, row.code if isinstance(row, Bottle) else row.name)


def _row(session: Session, kind: str, key: str) -> Lot | Bottle | StandardLot | Instrument | None:
    if kind == "lot":
        return lot_of_code(session, read_code(key))
    if kind == "bottle":
        return bottle_by_code(session, read_code(key))
    if kind == "standard lot":
        return session.get(StandardLot, key)
    return session.get(Instrument, key)
