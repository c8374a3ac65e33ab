"""What a bottle was used for: written by hand or by a script, struck through with a reason."""

from dataclasses import dataclass
from datetime import datetime
from typing import Any
from uuid import uuid4

from sqlalchemy.orm import Session

from server.lab.actor import Actor
from server.lab.free_text import MOST_REASON, read_reason, read_text
from server.lab.moments import read_moment
from server.lab.people import check_name
from server.lab.refusal import NotAllowed, NotFound, SavedFirst, Unacceptable
from server.lab.roles import Act
from server.procedures.acts import note_act
from server.procedures.bottles import known_bottle, thing_of
from server.records.queries.list_bottle_uses import same_uses, use_that_strikes
from server.records.queries.list_certificates import certificates_of_lot
from server.records.tables.lots import Bottle
from server.records.tables.shelf import BottleUse


@dataclass(frozen=True, slots=True)
class UseBottle:
    """A result that rests on a bottle.

    ``certificate``: the number that the result was reckoned with, empty for the one that stood
    then; ``used_at``: a local time or one with its offset, empty for now.
    """

    code: str
    result_id: str
    certificate: str = ""
    used_at: str = ""
    says: str = ""


@dataclass(frozen=True, slots=True)
class StrikeUse:
    """A use that was written by mistake."""

    code: str
    use_id: str
    reason: str


def use_bottle(
    session: Session,
    command: UseBottle,
    *,
    actor: Actor,
    now: datetime,
    token_id: str | None = None,
) -> str:
    """Write down what a bottle was used for; the same again is written once. Return its id.

    A bottle out of use takes it too: that somebody used it is just what a lab must know.

    Raises:
        SavedFirst: the result is written already, with another certificate or time.
    """
    actor.need(Act.USE)
    bottle = known_bottle(session, command.code)
    result_id = check_name(command.result_id, "result_id", example="W-2026-0417")
    says = read_text(command.says, "says", most=MOST_REASON)
    at = now
    if command.used_at.strip():
        at = read_moment(command.used_at, "used_at", zone=actor.zone, now=now)
    if at < bottle.filled_at:
        says = "used_at lies before this bottle was filled."
        raise Unacceptable(says, field="used_at", example=now.isoformat(timespec="minutes"))
    number = _certificate(session, bottle, command.certificate.strip(), at)
    for earlier in same_uses(session, bottle.id, result_id):
        if earlier.certificate_number == number and (
            not command.used_at.strip() or earlier.used_at == at
        ):
            return earlier.id
        raise SavedFirst(
            f"Result {result_id} is written for this bottle already; strike that line first.",
            field="result_id",
            shown={"standing": _told(earlier)},
        )
    row = BottleUse(
        id=str(uuid4()),
        bottle_id=bottle.id,
        result_id=result_id,
        certificate_number=number,
        used_at=at,
        says=says,
        person_id=actor.person_id,
        token_id=token_id,
        at=now,
    )
    session.add(row)
    session.flush()
    body = {"line": row.id, **_told(row)}
    note_act(session, "used a bottle", thing_of(bottle), actor=actor, now=now, body=body)
    return row.id


def strike_use(session: Session, command: StrikeUse, *, actor: Actor, now: datetime) -> None:
    """Strike a use through; it stays readable."""
    actor.need(Act.USE)
    bottle = known_bottle(session, command.code)
    row = session.get(BottleUse, command.use_id)
    if row is None or row.strikes or row.bottle_id != bottle.id:
        raise NotFound("This bottle has no such use.", field="use_id")
    why = read_reason(
        command.reason,
        says="Give the reason; the line stays readable.",
        example="written for another bottle",
    )
    if use_that_strikes(session, row.id) is not None:
        raise NotAllowed("This use is struck through already.", field="use_id")
    strike = BottleUse(
        id=str(uuid4()),
        bottle_id=bottle.id,
        result_id=row.result_id,
        certificate_number=row.certificate_number,
        used_at=row.used_at,
        says="",
        strikes=row.id,
        reason=why,
        person_id=actor.person_id,
        at=now,
    )
    session.add(strike)
    session.flush()
    body = {"line": row.id, **_told(row)}
    act = "struck a use through"
    note_act(session, act, thing_of(bottle), actor=actor, now=now, why=why, body=body)


def _certificate(session: Session, bottle: Bottle, given: str, at: datetime) -> str:
    """Return the number that was given, or that of the certificate which stood at an instant."""
    kept = certificates_of_lot(session, bottle.lot_id)
    if given:
        known = [one.row.number for one in kept]
        if given not in known:
            says = f"certificate {given[:40]} is none of this bottle's lot."
            example = known[0] if known else "leave it empty"
            raise Unacceptable(says, field="certificate", example=example)
        return given
    return next((one.row.number for one in kept if one.row.issued_at <= at), "")


def _told(row: BottleUse) -> dict[str, Any]:
    told = {
        "result": row.result_id,
        "certificate": row.certificate_number,
        "used at": row.used_at.isoformat(),
        "says": row.says,
    }
    return {key: value for key, value in told.items() if value}
