"""Watching a bottle or lot, and reading what is told of it: one's own wish, no lab record."""

import re
from dataclasses import dataclass
from datetime import datetime
from uuid import uuid4

from sqlalchemy.orm import Session

from server.lab.actor import Actor
from server.lab.codes import read_code
from server.lab.moments import read_moment
from server.lab.refusal import NotFound, Unacceptable
from server.lab.roles import Act
from server.records.queries.list_watches import BOTTLE, LOT, mailbox_of, standing_watch
from server.records.queries.load_lots import bottle_by_code, lot_of_code
from server.records.tables.people import Person
from server.records.tables.shelf import Mailbox, Watch

KINDS = (BOTTLE, LOT)
_MOST_ADDRESS = 254
_ADDRESS = re.compile(r"[^\s@<>,;:\"()\[\]\\]+@[^\s@<>,;:\"()\[\]\\]+\.[^\s@<>,;:\"()\[\]\\.]+")


@dataclass(frozen=True, slots=True)
class WatchThing:
    """The bottle or lot of a code, to be watched."""

    kind: str
    thing: str


@dataclass(frozen=True, slots=True)
class StopWatching:
    """The bottle or lot of a code, no longer to be watched."""

    kind: str
    thing: str


@dataclass(frozen=True, slots=True)
class ReadNotices:
    """Up to which instant the notices were seen, as their list tells it."""

    until: str


@dataclass(frozen=True, slots=True)
class SendNotices:
    """Where notices go by e-mail, empty for nowhere."""

    address: str


def watch_thing(session: Session, command: WatchThing, *, actor: Actor, now: datetime) -> str:
    """Watch a bottle or lot from now on; doing it twice changes nothing. Return the watch's id."""
    actor.need(Act.READ)
    thing_id = _thing_id(session, command.kind, command.thing)
    _lock(session, actor)
    standing = standing_watch(session, actor.person_id, command.kind, thing_id)
    if standing is not None:
        return standing.id
    row = Watch(
        id=str(uuid4()),
        person_id=actor.person_id,
        kind=command.kind,
        thing_id=thing_id,
        began_at=now,
    )
    session.add(row)
    session.flush()
    return row.id


def stop_watching(session: Session, command: StopWatching, *, actor: Actor, now: datetime) -> None:
    """End a watch; what was told stays in the list."""
    actor.need(Act.READ)
    thing_id = _thing_id(session, command.kind, command.thing)
    _lock(session, actor)
    standing = standing_watch(session, actor.person_id, command.kind, thing_id)
    if standing is not None:
        standing.ended_at = now
        session.flush()


def read_notices(session: Session, command: ReadNotices, *, actor: Actor, now: datetime) -> None:
    """Count the notices up to an instant as read."""
    actor.need(Act.READ)
    until = read_moment(command.until, "until", zone=actor.zone, now=now)
    box = _mailbox(session, actor)
    if box.read_until is None or box.read_until < until:
        box.read_until = until
        session.flush()


def send_notices(session: Session, command: SendNotices, *, actor: Actor, now: datetime) -> None:
    """Send what changes from now on by e-mail as well; an empty address sends nothing more."""
    actor.need(Act.READ)
    address = command.address.strip()
    if address and (len(address) > _MOST_ADDRESS or not _ADDRESS.fullmatch(address)):
        says = "address must be one e-mail address."
        raise Unacceptable(says, field="address", example="ida@waterworks.example")
    box = _mailbox(session, actor)
    if box.address != address:
        box.address, box.address_since = address, now if address else None
        session.flush()


def _thing_id(session: Session, kind: str, text: str) -> str:
    if kind not in KINDS:
        says = f"kind cannot be “{kind[:40]}”; it is one of {', '.join(KINDS)}."
        raise Unacceptable(says, field="kind", example=BOTTLE)
    code = read_code(text)
    row = bottle_by_code(session, code) if kind == BOTTLE else lot_of_code(session, code)
    if row is None:
        raise NotFound(f"There is no {kind} {code}.", field="thing")
    return row.id


def _mailbox(session: Session, actor: Actor) -> Mailbox:
    _lock(session, actor)
    box = mailbox_of(session, actor.person_id)
    if box is None:
        box = Mailbox(person_id=actor.person_id, address="")
        session.add(box)
    return box


def _lock(session: Session, actor: Actor) -> None:
    """Let two requests of one person follow each other."""
    session.get_one(Person, actor.person_id, with_for_update=True)
