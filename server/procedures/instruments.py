"""Instruments and their calibrations, kept by a keeper."""

from dataclasses import dataclass
from datetime import datetime
from typing import Any
from uuid import uuid4

from sqlalchemy.orm import Session

from server.lab.actor import Actor
from server.lab.free_text import read_text
from server.lab.papers import check_kind, read_calibration
from server.lab.people import check_name
from server.lab.refusal import NotFound, Unacceptable
from server.lab.roles import Act
from server.lab.validity import end_of_day, local_day, read_day
from server.metrology.decimal_text import DecimalProblem, read_wire_decimal
from server.procedures.acts import Thing, note_act
from server.records.queries.loading import instrument_by_name, newest_calibration
from server.records.tables.stores import Calibration, Instrument

_MOST_TEXT = 200
_DECIMALS = ("", "0", "1", "2", "3", "4", "5", "6")


@dataclass(frozen=True, slots=True)
class RegisterInstrument:
    """An instrument's identity.

    ``resolution`` is the smallest step that is shown or drawn, in the unit of its readings (g,
    mL, °C); ``decimals`` how many decimals a reading has, where the resolution does not say.
    """

    kind: str
    name: str
    maker: str
    type: str
    serial: str
    location: str
    resolution: str = ""
    capacity: str = ""
    decimals: str = ""
    minimum_g: str = ""
    software: str = ""


@dataclass(frozen=True, slots=True)
class RecordCalibration:
    """A calibration: its certificate, its due day, and its statements as in a bench record."""

    instrument_id: str
    certificate_number: str
    issuer: str
    done_on: str
    due_on: str
    due_basis: str
    document: dict[str, Any]


def register_instrument(
    session: Session, command: RegisterInstrument, *, actor: Actor, now: datetime
) -> str:
    """Keep an instrument; return its id. It is not used before a calibration is recorded."""
    actor.need(Act.KEEP)
    kind = check_kind(command.kind)
    name = check_name(command.name, "name", example="Balance B-2")
    if instrument_by_name(session, name) is not None:
        raise Unacceptable(f"There is an instrument “{name}” already.", field="name")
    for field in ("resolution", "capacity", "minimum_g"):
        _check_positive(getattr(command, field), field)
    if command.decimals not in _DECIMALS:
        says = "decimals must be a whole number from 0 to 6."
        raise Unacceptable(says, field="decimals", example="2")
    if kind in {"balance", "burette"} and not command.resolution:
        says = f"A {kind} needs its resolution, for the digits of a reading depend on it."
        raise Unacceptable(says, field="resolution", example="0.0001")
    keys = ("maker", "type", "serial", "location", "resolution", "capacity", "decimals",
            "minimum_g", "software")  # fmt: skip
    stated = {key: read_text(getattr(command, key), key, most=_MOST_TEXT) for key in keys}
    row = Instrument(
        id=str(uuid4()),
        kind=kind,
        name=name,
        document={key: value for key, value in stated.items() if value},
        made_by=actor.person_id,
        made_at=now,
    )
    session.add(row)
    session.flush()
    thing = Thing("instrument", row.id, row.name)
    body = {"kind": kind, **row.document}
    note_act(session, "registered an instrument", thing, actor=actor, now=now, body=body)
    return row.id


def record_calibration(
    session: Session, command: RecordCalibration, *, actor: Actor, now: datetime
) -> str:
    """Record a calibration as the version that serves from now on; return its id.

    Sheets that began with an older version keep it.
    """
    actor.need(Act.KEEP)
    instrument = session.get(Instrument, command.instrument_id, with_for_update=True)
    if instrument is None:
        raise NotFound("There is no such instrument.", field="instrument_id")
    done_on = read_day(command.done_on, "done_on")
    due_on = read_day(command.due_on, "due_on")
    if done_on > local_day(now, actor.zone):
        raise Unacceptable("The calibration's day lies in the future.", field="done_on")
    if due_on < done_on:
        says = "The due day lies before the day of the calibration."
        raise Unacceptable(says, field="due_on", example=command.done_on)
    newest = newest_calibration(session, instrument.id)
    row = Calibration(
        id=str(uuid4()),
        instrument_id=instrument.id,
        version=newest.version + 1 if newest else 1,
        certificate_number=check_name(
            command.certificate_number, "certificate_number", example="C-2026-118"
        ),
        issuer=check_name(command.issuer, "issuer", example="calibration laboratory"),
        done_on=done_on.isoformat(),
        due_at=end_of_day(due_on, actor.zone),
        due_basis=check_name(command.due_basis, "due_basis", example="12 months, own plan"),
        document=read_calibration(instrument.kind, command.document),
        made_by=actor.person_id,
        made_at=now,
    )
    session.add(row)
    session.flush()
    thing = Thing("instrument", instrument.id, instrument.name)
    body = {
        "calibration": row.id,
        "version": row.version,
        "certificate_number": row.certificate_number,
        "done_on": row.done_on,
        "due_on": due_on.isoformat(),
        "document": row.document,
    }
    note_act(session, "recorded a calibration", thing, actor=actor, now=now, body=body)
    return row.id


def _check_positive(text: str, field: str) -> None:
    if not text:
        return
    try:
        number = read_wire_decimal(text, field)
    except DecimalProblem as problem:
        raise Unacceptable(problem.says, field=field, example="0.0001") from problem
    if number <= 0:
        raise Unacceptable(f"{field} must be more than zero.", field=field, example="0.0001")
