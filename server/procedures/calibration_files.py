"""Handing over the original of a calibration, before its values are confirmed."""

from dataclasses import dataclass
from datetime import datetime

from sqlalchemy.orm import Session

from server.intake.kept_files import read_original
from server.lab.actor import Actor
from server.lab.roles import Act
from server.procedures.acts import Thing, note_act
from server.procedures.calibration_papers import locked_instrument
from server.procedures.files import keep_file


@dataclass(frozen=True, slots=True)
class HandOver:
    """The original of a calibration, as base64 text, with the name that it came under."""

    instrument_id: str
    file_name: str
    content_base64: str


def hand_over(session: Session, command: HandOver, *, actor: Actor, now: datetime) -> str:
    """Keep a calibration's original as it came; return the file's id. It changes nothing yet.

    Raises:
        Unacceptable: too large, empty, or of a kind that is not kept.
    """
    actor.need(Act.KEEP)
    row = locked_instrument(session, command.instrument_id)
    original = read_original(command.file_name, command.content_base64)
    file_id = keep_file(session, original, actor=actor, now=now)
    thing = Thing("instrument", row.id, row.name)
    body = {"file": {"id": file_id, "name": original.name, "sha256": original.sha256}}
    note_act(
        session, "handed over a calibration's original", thing, actor=actor, now=now, body=body
    )
    return file_id
