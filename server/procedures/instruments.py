"""Instruments, their identity, and calibrations by certificate, kept by a keeper."""

from collections.abc import Mapping
from dataclasses import dataclass
from datetime import datetime
from typing import Any
from uuid import uuid4

from sqlalchemy.orm import Session

from server.lab.actor import Actor
from server.lab.free_text import read_reason, read_text
from server.lab.identity import DESCRIBED, check_described
from server.lab.papers import check_kind, read_calibration
from server.lab.people import check_name
from server.lab.refusal import SavedFirst, Unacceptable
from server.lab.roles import Act
from server.metrology.decimal_text import DecimalProblem, read_wire_decimal
from server.procedures.acts import Thing, note_act
from server.procedures.calibration_papers import (
    Kept,
    Papers,
    keep_calibration,
    locked_instrument,
)
from server.records.queries.loading import instrument_by_name
from server.records.tables.stores import Instrument

_MOST_TEXT = 200
_MOST_DESCRIBED = 500
_LONG = frozenset({"verification", "adjustments", "acceptance", "references", "software"})
_DECIMALS = ("", "0", "1", "2", "3", "4", "5", "6")


@dataclass(frozen=True, slots=True)
class RegisterInstrument:
    """An instrument's identity.

    ``resolution`` is the smallest step that is shown or drawn, in the unit of its readings (g,
    mL, °C); ``decimals`` how many decimals a reading has, where the resolution does not say. What
    describes it may be "not applicable" with the reason.
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
    verification: str = ""
    adjustments: str = ""
    acceptance: str = ""
    references: str = ""


@dataclass(frozen=True, slots=True)
class DescribeInstrument:
    """What describes an instrument anew, with the reason; ``seen`` is what stood when it was read.

    ``described``: maker, type, serial, location, software, verification, adjustments, acceptance,
    references; a key that is absent stays as it is.
    """

    instrument_id: str
    described: dict[str, str]
    reason: str
    seen: dict[str, str]


@dataclass(frozen=True, slots=True)
class RecordCalibration:
    """A calibration: its certificate, its due day, and its statements as in a bench record.

    ``file_id`` is the original that was handed over before, where there is one.
    """

    instrument_id: str
    certificate_number: str
    issuer: str
    done_on: str
    due_on: str
    due_basis: str
    document: dict[str, Any]
    file_id: str | None = None


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
    scale = ("resolution", "capacity", "decimals", "minimum_g")
    stated = {key: read_text(getattr(command, key), key, most=_MOST_TEXT) for key in scale}
    stated |= _described({key: getattr(command, key) for key in DESCRIBED})
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


def describe_instrument(
    session: Session, command: DescribeInstrument, *, actor: Actor, now: datetime
) -> None:
    """Describe an instrument anew; the trail keeps what stood before.

    Its scale (resolution, capacity, decimals) stays: readings that were written rest on it.

    Raises:
        SavedFirst: somebody described it since it was read.
        Unacceptable: a key that cannot be changed, "not applicable" without why, no reason.
    """
    actor.need(Act.KEEP)
    row = locked_instrument(session, command.instrument_id)
    unknown = sorted(set(command.described) - set(DESCRIBED))
    if unknown:
        says = f"described.{unknown[0]} is not known here; known are {', '.join(DESCRIBED)}."
        raise Unacceptable(says, field=f"described.{unknown[0]}", example=DESCRIBED[0])
    stands = {key: row.document.get(key, "") for key in DESCRIBED}
    if any(stands[key] != command.seen.get(key, "") for key in command.described):
        says = "Somebody described this instrument meanwhile; look at it and write from there."
        raise SavedFirst(says, field="described", shown={"standing": stands})
    reason = read_reason(
        command.reason, says="Give the reason for the change.", example="moved to bench 3"
    )
    described = {**stands, **_described(command.described)}
    changed = {key: value for key, value in described.items() if value != stands[key]}
    if not changed:
        raise Unacceptable("Nothing was changed.", field="described")
    kept = {**row.document, **described}
    row.document = {key: value for key, value in kept.items() if value}
    session.flush()
    thing = Thing("instrument", row.id, row.name)
    body = {"before": {key: stands[key] for key in changed}, "after": changed}
    note_act(session, "described an instrument", thing, actor=actor, now=now, why=reason, body=body)


def record_calibration(
    session: Session, command: RecordCalibration, *, actor: Actor, now: datetime
) -> str:
    """Record a calibration as the version that serves from now on; return its id.

    Sheets that began with an older version keep it.
    """
    actor.need(Act.KEEP)
    instrument = locked_instrument(session, command.instrument_id)
    papers = Papers(
        certificate_number=command.certificate_number,
        issuer=command.issuer,
        done_on=command.done_on,
        due_on=command.due_on,
        due_basis=command.due_basis,
    )
    document = read_calibration(instrument.kind, command.document)
    return keep_calibration(
        session, instrument, papers, Kept(document, file_id=command.file_id or None),
        act="recorded a calibration", actor=actor, now=now,
    )  # fmt: skip


def _described(texts: Mapping[str, str]) -> dict[str, str]:
    found = {
        key: read_text(text, key, most=_MOST_DESCRIBED if key in _LONG else _MOST_TEXT)
        for key, text in texts.items()
    }
    for key, text in found.items():
        check_described(text, key)
    return found


def _check_positive(text: str, field: str) -> None:
    if not text:
        return
    try:
        number = read_wire_decimal(text, field)
    except DecimalProblem as problem:
        raise Unacceptable(problem.says, field=field, example="0.0001") from problem
    if number <= 0:
        raise Unacceptable(f"{field} must be more than zero.", field=field, example="0.0001")
