"""The life of a standard lot: opened, dried, used, counted, re-tested; its certificate's file."""

from dataclasses import dataclass
from datetime import UTC, date, datetime
from decimal import Decimal
from typing import Any

from sqlalchemy.orm import Session

from server.intake.kept_files import read_original
from server.lab.actor import Actor
from server.lab.calibration.drying_log import read_drying
from server.lab.calibration.typed_numbers import read_number
from server.lab.free_text import MOST_REASON, read_reason, read_text
from server.lab.lot_log import COUNT, DRYING, OPENED, RETEST, USE, opened_on
from server.lab.lot_uses import remaining_of, running_uses
from server.lab.refusal import NotAllowed, NotFound, Unacceptable
from server.lab.roles import Act
from server.lab.sheet_facts import STANDARD_LOT
from server.lab.validity import local_day, read_day, read_zone
from server.procedures.acts import Thing, note_act
from server.procedures.files import keep_file
from server.procedures.log import strike_line, write_line
from server.records.queries.list_log import log_lines
from server.records.queries.list_uses import all_taken
from server.records.tables.stores import StandardLot

_MOST_G = "100000"


@dataclass(frozen=True, slots=True)
class OpenStandardLot:
    """The day on which a container was opened, year-month-day."""

    standard_lot_id: str
    day: str


@dataclass(frozen=True, slots=True)
class RecordDrying:
    """A drying: °C and hours as typed (both empty: no oven), desiccator or not, when it ended.

    ``ended_at`` is a local time (year-month-dayThour:minute) or one with its offset.
    """

    standard_lot_id: str
    ended_at: str
    temperature: str = ""
    hours: str = ""
    desiccator: bool = False
    says: str = ""


@dataclass(frozen=True, slots=True)
class RecordUse:
    """Some of a lot taken for something else than a bench sheet: g as typed, and what for."""

    standard_lot_id: str
    mass_g: str
    says: str


@dataclass(frozen=True, slots=True)
class CountStandardLot:
    """What is there by weighing the container, in g as typed; the running mass begins anew."""

    standard_lot_id: str
    mass_g: str
    says: str = ""


@dataclass(frozen=True, slots=True)
class RecordRetest:
    """A re-test: its day, what it found, and the day of the next one."""

    standard_lot_id: str
    done_on: str
    next_on: str
    says: str


@dataclass(frozen=True, slots=True)
class StrikeLotLine:
    """A line of a lot's log struck through, with the reason."""

    standard_lot_id: str
    line_id: str
    reason: str


@dataclass(frozen=True, slots=True)
class AttachCertificate:
    """The certificate of a lot as a file; ``reason`` where it takes the place of another one."""

    standard_lot_id: str
    file_name: str
    content_base64: str
    reason: str = ""


def open_lot(session: Session, command: OpenStandardLot, *, actor: Actor, now: datetime) -> str:
    """Write that a lot was opened; the period after opening, if it has one, begins."""
    lot = _lot(session, command.standard_lot_id, actor, Act.LOG)
    day = _past_day(command.day, "day", actor=actor, now=now)
    before = opened_on(_log(session, lot))
    if before is not None:
        says = f"{lot.name} was opened on {before.isoformat()}; strike that line if it is wrong."
        raise NotAllowed(says, field="day")
    document = {"day": day.isoformat()}
    return _write(session, lot, OPENED, document, act="opened a standard lot", actor=actor, now=now)


def record_drying(session: Session, command: RecordDrying, *, actor: Actor, now: datetime) -> str:
    """Write a drying in the log of a lot; the bench knows it from now on."""
    lot = _lot(session, command.standard_lot_id, actor, Act.LOG)
    ended_at = _past_instant(command.ended_at, actor=actor, now=now)
    oven = {"temperature": command.temperature.strip(), "hours": command.hours.strip()}
    document: dict[str, Any] = {key: value for key, value in oven.items() if value}
    document["desiccator"] = command.desiccator
    read_drying(document, ended_at, path="")
    document["ended_at"] = ended_at.isoformat()
    says = read_text(command.says, "says", most=MOST_REASON)
    if says:
        document["says"] = says
    return _write(session, lot, DRYING, document, act="dried a standard lot", actor=actor, now=now)


def record_use(session: Session, command: RecordUse, *, actor: Actor, now: datetime) -> str:
    """Write a use that no bench sheet holds.

    Raises:
        Unacceptable: more than is left, or no mass above zero.
    """
    lot = _lot(session, command.standard_lot_id, actor, Act.LOG)
    mass = _grams(command.mass_g)
    says = read_reason(
        command.says, "says", says="Say what it was taken for.", example="loss on drying"
    )
    left = remaining_of(lot.document, running_uses(lot.document, all_taken(session, lot.id)))
    if left is not None and mass > left.left_g:
        text = f"Only {left.left_g} g of {lot.name} are left by this log."
        if left.left_g < 0:
            text = f"By this log {left.taken_g} g of {left.received_g} g were taken already."
        text += " If more is there, write first what you count."
        raise Unacceptable(text, field="mass_g", example=str(max(left.left_g, Decimal(0))))
    document = {"mass_g": command.mass_g.strip(), "says": says}
    return _write(session, lot, USE, document, act="used a standard lot", actor=actor, now=now)


def count_lot(session: Session, command: CountStandardLot, *, actor: Actor, now: datetime) -> str:
    """Write how much of a lot is there by weighing it."""
    lot = _lot(session, command.standard_lot_id, actor, Act.LOG)
    read_number(command.mass_g, "mass_g", example="23.10", low="0", high=_MOST_G)
    says = read_text(command.says, "says", most=MOST_REASON)
    document = {"mass_g": command.mass_g.strip()} | ({"says": says} if says else {})
    return _write(session, lot, COUNT, document, act="counted a standard lot", actor=actor, now=now)


def record_retest(session: Session, command: RecordRetest, *, actor: Actor, now: datetime) -> str:
    """Write a re-test: the day of the next one replaces the one before as a rule of its end."""
    lot = _lot(session, command.standard_lot_id, actor, Act.KEEP)
    done_on = _past_day(command.done_on, "done_on", actor=actor, now=now)
    next_on = read_day(command.next_on, "next_on")
    if next_on <= done_on:
        says = "The next re-test must come after this one."
        raise Unacceptable(says, field="next_on", example="2028-01-31")
    found = read_reason(
        command.says, "says", says="Say what the re-test found.",
        example="mass fraction 0.9998 against lot 7, unchanged",
    )  # fmt: skip
    document = {"done_on": done_on.isoformat(), "next_on": next_on.isoformat(), "says": found}
    return _write(
        session, lot, RETEST, document, act="re-tested a standard lot", actor=actor, now=now
    )


def strike_lot_line(
    session: Session, command: StrikeLotLine, *, actor: Actor, now: datetime
) -> None:
    """Strike a line of a lot's log through; what followed from it no longer does.

    A re-test is struck by a keeper alone, as only a keeper writes one.
    """
    lot = _lot(session, command.standard_lot_id, actor, Act.LOG)
    thing = _thing(lot)
    struck = strike_line(session, thing, command.line_id, command.reason, actor=actor, now=now)
    if struck.what == RETEST:
        actor.need(Act.KEEP)


def attach_certificate(
    session: Session, command: AttachCertificate, *, actor: Actor, now: datetime
) -> str:
    """Keep the file of a lot's certificate with its SHA-256; return the file's id.

    Raises:
        Unacceptable: no file of a kind that is kept, or one is there and no reason is given.
    """
    lot = _lot(session, command.standard_lot_id, actor, Act.KEEP)
    original = read_original(command.file_name, command.content_base64)
    why = None
    if lot.file_id is not None:
        why = read_reason(
            command.reason,
            says="There is a file already; say why this one takes its place.",
            example="the page with the mass fraction was missing",
        )
    before, lot.file_id = lot.file_id, keep_file(session, original, actor=actor, now=now)
    session.flush()
    body = {"file": lot.file_id, "name": original.name, "sha256": original.sha256, "before": before}
    note_act(
        session, "kept a certificate's file", _thing(lot), actor=actor, now=now, why=why, body=body
    )
    return lot.file_id


def _lot(session: Session, standard_lot_id: str, actor: Actor, act: Act) -> StandardLot:
    """Return a lot's row, locked until the commit: two who take the last of it meet here."""
    actor.need(act)
    row = session.get(StandardLot, standard_lot_id, with_for_update=True)
    if row is None:
        raise NotFound("There is no such standard lot.", field="standard_lot_id")
    return row


def _thing(lot: StandardLot) -> Thing:
    return Thing(STANDARD_LOT, lot.id, lot.name)


def _log(session: Session, lot: StandardLot) -> Any:
    return log_lines(session, STANDARD_LOT, (lot.id,)).get(lot.id, ())


def _write(
    session: Session, lot: StandardLot, what: str, document: dict[str, Any], **more: Any
) -> str:
    return write_line(session, _thing(lot), what, document, **more)


def _past_day(text: str, field: str, *, actor: Actor, now: datetime) -> date:
    day = read_day(text, field)
    if day > local_day(now, actor.zone):
        raise Unacceptable("This day lies in the future.", field=field)
    return day


def _past_instant(text: str, *, actor: Actor, now: datetime) -> datetime:
    """Return the instant of a local time, or of one with its offset."""
    try:
        at = datetime.fromisoformat(text.strip())
        at = at.replace(tzinfo=read_zone(actor.zone)) if at.tzinfo is None else at
        at = at.astimezone(UTC)
    except (ValueError, OverflowError) as problem:
        says = "ended_at must be a time, written year-month-dayThour:minute."
        raise Unacceptable(says, field="ended_at", example="2026-05-31T14:05") from problem
    if at > now:
        raise Unacceptable("This time lies in the future.", field="ended_at")
    if at.year < 1900:
        raise Unacceptable("This time lies too far back.", field="ended_at")
    return at


def _grams(text: str) -> Decimal:
    mass = read_number(text, "mass_g", example="0.5012", low="0", high=_MOST_G)
    if mass == 0:
        raise Unacceptable("mass_g must be above zero.", field="mass_g", example="0.5012")
    return mass
