"""Lines in the logs of standard lots and instruments: written in ink, struck with a reason."""

from collections.abc import Mapping
from datetime import datetime
from typing import Any
from uuid import uuid4

from sqlalchemy.orm import Session

from server.lab.actor import Actor
from server.lab.free_text import read_reason
from server.lab.refusal import NotAllowed, NotFound
from server.procedures.acts import Thing, note_act
from server.records.queries.loading import line_that_strikes
from server.records.tables.stores import Log


def write_line(
    session: Session,
    thing: Thing,
    what: str,
    document: Mapping[str, Any],
    *,
    act: str,
    actor: Actor,
    now: datetime,
) -> str:
    """Write a line in the log of a thing and note it in the trail; return its id."""
    row = _line(thing, what, document, actor=actor, now=now)
    session.add(row)
    session.flush()
    body = {"line": row.id, "what": what, **document}
    note_act(session, act, thing, actor=actor, now=now, body=body)
    return row.id


def strike_line(
    session: Session, thing: Thing, line_id: str, reason: str, *, actor: Actor, now: datetime
) -> Log:
    """Strike a line of the log of a thing through; it stays readable. Return the struck line.

    Raises:
        NotFound: the thing's log has no such line.
        NotAllowed: it is struck through already.
        Unacceptable: no reason.
    """
    row = session.get(Log, line_id)
    if row is None or row.strikes or (row.kind, row.thing_id) != (thing.kind, thing.id):
        raise NotFound("There is no such line in this log.", field="line_id")
    why = read_reason(
        reason, says="Give the reason; the line stays readable.", example="written for another lot"
    )
    if line_that_strikes(session, row.id) is not None:
        raise NotAllowed("This line is struck through already.", field="line_id")
    strike = _line(thing, row.what, {}, actor=actor, now=now)
    strike.strikes, strike.reason = row.id, why
    session.add(strike)
    session.flush()
    body = {"line": row.id, "what": row.what, **row.document}
    note_act(
        session, "struck a line of a log through", thing, actor=actor, now=now, why=why, body=body
    )
    return row


def _line(
    thing: Thing, what: str, document: Mapping[str, Any], *, actor: Actor, now: datetime
) -> Log:
    return Log(
        id=str(uuid4()),
        kind=thing.kind,
        thing_id=thing.id,
        what=what,
        document=dict(document),
        person_id=actor.person_id,
        at=now,
    )
