"""Titrant lots and their bottles: made up, filled, used up, pulled."""

import random
from dataclasses import dataclass
from datetime import datetime
from random import Random
from uuid import uuid4

from sqlalchemy.orm import Session

from server.chemistry.formula import FormulaProblem, atoms_of
from server.chemistry.substances import SUBSTANCES
from server.lab.actor import Actor
from server.lab.codes import new_code, read_code
from server.lab.free_text import read_reason, read_text
from server.lab.opened import read_opened_days
from server.lab.people import check_name
from server.lab.refusal import NotAllowed, NotFound, Unacceptable
from server.lab.roles import Act
from server.lab.segregation import pull_refusal
from server.lab.validity import local_day, read_day
from server.metrology.decimal_text import DecimalProblem, read_typed_decimal, read_wire_decimal
from server.procedures.acts import Thing, note_act
from server.records.queries.load_lots import (
    bottle_by_code,
    code_is_taken,
    last_bottle_number,
    lot_by_name,
    lot_is_pulled,
    lot_of_code,
    open_pull,
)
from server.records.queries.loading import next_number
from server.records.tables.lots import Bottle, Lot, Pull

MOST_BOTTLES = 50
_MOST_STEPS = 10_000


@dataclass(frozen=True, slots=True)
class MakeUpLot:
    """A solution of one preparation.

    ``nominal`` in mol/L as text; ``preparation`` is what was done, one step a line; ``use_by`` a
    day after which no certificate of this lot is valid, ``opened_days`` for how many days a bottle
    keeps once it is open. An empty name is made from the rest.
    """

    titrant: str
    nominal: str
    name: str = ""
    medium: str = "water"
    prepared_on: str = ""
    made_from: str = ""
    preparation: str = ""
    recipe_name: str = ""
    use_by: str = ""
    opened_days: str = ""


@dataclass(frozen=True, slots=True)
class FillBottles:
    """Bottles filled from a lot, each with its own code."""

    lot_code: str
    place: str
    volume_mL: str
    count: int = 1


@dataclass(frozen=True, slots=True)
class UseUpBottle:
    """A bottle that is empty."""

    code: str


@dataclass(frozen=True, slots=True)
class ProposePull:
    """A keeper's proposal to take a lot out of use for good."""

    lot_code: str
    reason: str


@dataclass(frozen=True, slots=True)
class ConfirmPull:
    """A countersigner's confirmation of a proposed pull."""

    lot_code: str


def make_up_lot(
    session: Session,
    command: MakeUpLot,
    *,
    actor: Actor,
    now: datetime,
    source: Random | None = None,
) -> str:
    """Keep a lot that was made up; return its code."""
    actor.need(Act.MAKE_UP)
    titrant = _titrant(command.titrant)
    nominal = _positive(command.nominal, "nominal", unit="mol/L", most=30, example="0.1")
    today = local_day(now, actor.zone)
    day = read_day(command.prepared_on, "prepared_on") if command.prepared_on else today
    if day > today:
        raise Unacceptable("The day of preparation lies in the future.", field="prepared_on")
    use_by = read_day(command.use_by, "use_by") if command.use_by else None
    if use_by is not None and use_by < day:
        raise Unacceptable("The use-by day lies before the preparation.", field="use_by")
    name = _lot_name(session, command, f"{titrant} {nominal} mol/L, {day.isoformat()}")
    opened_days = read_opened_days(command.opened_days)
    steps = read_text(command.preparation, "preparation", most=_MOST_STEPS)
    stated = {
        "prepared_on": day.isoformat(),
        "made_from": read_text(command.made_from, "made_from"),
        "preparation": [line.strip() for line in steps.splitlines() if line.strip()],
        "recipe_name": read_text(command.recipe_name, "recipe_name"),
        "use_by": use_by.isoformat() if use_by else "",
        "opened_days": str(opened_days) if opened_days else "",
    }
    lot = Lot(
        id=str(uuid4()),
        code=_free_code(session, source),
        name=name,
        titrant=titrant,
        nominal=nominal,
        medium=check_name(command.medium, "medium", example="water"),
        document={key: value for key, value in stated.items() if value},
        made_by=actor.person_id,
        made_at=now,
    )
    session.add(lot)
    session.flush()
    body = {"code": lot.code, "titrant": titrant, "nominal": nominal, "medium": lot.medium}
    body |= lot.document
    note_act(session, "made up a lot", _lot_thing(lot), actor=actor, now=now, body=body)
    return lot.code


def fill_bottles(
    session: Session,
    command: FillBottles,
    *,
    actor: Actor,
    now: datetime,
    source: Random | None = None,
) -> tuple[str, ...]:
    """Fill bottles from a lot; return their codes in order."""
    actor.need(Act.BOTTLE)
    lot = _lot(session, command.lot_code, lock=True)
    _refuse_pulled(session, lot)
    if not 1 <= command.count <= MOST_BOTTLES:
        says = f"count must be from 1 to {MOST_BOTTLES}."
        raise Unacceptable(says, field="count", example="2")
    volume = _positive(command.volume_mL, "volume_mL", unit="mL", most=1_000_000, example="1000")
    place = check_name(command.place, "place", example="Shelf 3")
    first = last_bottle_number(session, lot.id) + 1
    codes = []
    for number in range(first, first + command.count):
        bottle = Bottle(
            id=str(uuid4()),
            code=_free_code(session, source),
            lot_id=lot.id,
            number=number,
            place=place,
            volume_mL=volume,
            filled_by=actor.person_id,
            filled_at=now,
        )
        session.add(bottle)
        session.flush()
        codes.append(bottle.code)
        body = {"lot": lot.name, "number": number, "place": place, "volume_mL": volume}
        thing = Thing("bottle", bottle.id, bottle.code)
        note_act(session, "filled a bottle", thing, actor=actor, now=now, body=body)
    return tuple(codes)


def use_up_bottle(session: Session, command: UseUpBottle, *, actor: Actor, now: datetime) -> None:
    """Write down that a bottle is empty; doing it twice changes nothing."""
    actor.need(Act.BOTTLE)
    code = read_code(command.code)
    bottle = bottle_by_code(session, code)
    if bottle is None:
        raise NotFound(f"There is no bottle {code}.", field="code")
    session.refresh(bottle, with_for_update=True)
    if bottle.used_up_at is not None:
        return
    bottle.used_up_at = now
    bottle.used_up_by = actor.person_id
    session.flush()
    thing = Thing("bottle", bottle.id, bottle.code)
    note_act(session, "used up a bottle", thing, actor=actor, now=now)


def propose_pull(session: Session, command: ProposePull, *, actor: Actor, now: datetime) -> str:
    """Propose to take a lot out of use for good; return the proposal's id."""
    actor.need(Act.PROPOSE_PULL)
    lot = _lot(session, command.lot_code, lock=True)
    _refuse_pulled(session, lot)
    if open_pull(session, lot.id) is not None:
        raise NotAllowed("A pull of this lot is proposed already; a countersigner confirms it.")
    reason = read_reason(command.reason, says="Give the reason.", example="cloudy")
    pull = Pull(
        id=str(uuid4()),
        lot_id=lot.id,
        reason=reason,
        proposed_by=actor.person_id,
        proposed_at=now,
    )
    session.add(pull)
    session.flush()
    note_act(session, "proposed a pull", _lot_thing(lot), actor=actor, now=now, why=reason)
    return pull.id


def confirm_pull(session: Session, command: ConfirmPull, *, actor: Actor, now: datetime) -> None:
    """Take a lot out of use for good, as somebody else proposed."""
    actor.need(Act.CONFIRM_PULL)
    lot = _lot(session, command.lot_code, lock=True)
    pull = open_pull(session, lot.id)
    if pull is None:
        raise NotFound("No pull of this lot is proposed.", field="lot_code")
    refusal = pull_refusal(pull.proposed_by, actor.person_id)
    if refusal:
        raise NotAllowed(refusal)
    pull.confirmed_by = actor.person_id
    pull.confirmed_at = now
    session.flush()
    note_act(session, "pulled a lot", _lot_thing(lot), actor=actor, now=now, why=pull.reason)


def _lot(session: Session, code: str, *, lock: bool = False) -> Lot:
    lot = lot_of_code(session, read_code(code))
    if lot is None:
        raise NotFound(f"There is no lot {code[:40]}.", field="lot_code")
    if lock:
        session.refresh(lot, with_for_update=True)
    return lot


def _refuse_pulled(session: Session, lot: Lot) -> None:
    if lot_is_pulled(session, lot.id):
        raise NotAllowed("This lot was pulled: it is out of use for good.")


def _lot_name(session: Session, command: MakeUpLot, proposed: str) -> str:
    if command.name.strip():
        name = check_name(command.name, "name", example=proposed)
        if lot_by_name(session, name) is not None:
            raise Unacceptable(f"There is a lot “{name}” already.", field="name", example=proposed)
        return name
    while True:
        n = next_number(session, f"lot named {proposed}")
        name = proposed if n == 1 else f"{proposed} ({n})"
        if lot_by_name(session, name) is None:
            return name


def _free_code(session: Session, source: Random | None) -> str:
    """Return a code that nothing has yet; from the system's randomness where no source is given."""
    drawn = source or random.SystemRandom()
    while True:
        code = new_code(drawn)
        if not code_is_taken(session, code):
            return code


def _titrant(text: str) -> str:
    """Return a substance that is known here, or one whose formula can be read."""
    titrant = check_name(text, "titrant", example="NaOH")
    if titrant not in SUBSTANCES:
        try:
            atoms_of(titrant)
        except FormulaProblem as problem:
            says = f"titrant: {problem}."
            raise Unacceptable(says, field="titrant", example="NaOH") from problem
    return titrant


def _positive(text: str, field: str, *, unit: str, most: int, example: str) -> str:
    try:
        read_wire_decimal(text, field)
        number = read_typed_decimal(text, field)  # and no exponent
    except DecimalProblem as problem:
        raise Unacceptable(problem.says, field=field, example=example) from problem
    if number <= 0:
        raise Unacceptable(f"{field} must be more than zero.", field=field, example=example)
    if number > most:
        says = f"{field}: {text} {unit} cannot be; {most} {unit} is the most."
        raise Unacceptable(says, field=field, example=example)
    return text


def _lot_thing(lot: Lot) -> Thing:
    return Thing("lot", lot.id, lot.name)
