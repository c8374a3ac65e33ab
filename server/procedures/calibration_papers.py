"""Keeping a calibration as the version that serves from now on."""

from dataclasses import dataclass
from datetime import datetime
from typing import Any
from uuid import uuid4

from sqlalchemy.orm import Session

from server.lab.actor import Actor
from server.lab.canonical import canonical, digest
from server.lab.people import check_name
from server.lab.refusal import NotFound, Unacceptable
from server.lab.validity import end_of_day, local_day, read_day
from server.procedures.acts import Thing, note_act
from server.records.queries.loading import newest_calibration, next_number
from server.records.tables.stores import Calibration, File, Instrument

#: Who calibrated, where nobody else is named.
OWN = "own calibration"


@dataclass(frozen=True, slots=True)
class Papers:
    """What stands around a calibration: its number, who issued it, when it was done, until when.

    An own run may leave number and issuer empty: it is numbered here.
    """

    certificate_number: str
    issuer: str
    done_on: str
    due_on: str
    due_basis: str


@dataclass(frozen=True, slots=True)
class Kept:
    """What a calibration states for use, the run that it came from, the original that it came as.

    ``run`` and ``file_id`` are None where there is none; ``reason`` is why a run that fails serves.
    """

    document: dict[str, Any]
    run: dict[str, Any] | None = None
    file_id: str | None = None
    reason: str = ""


def locked_instrument(session: Session, instrument_id: str) -> Instrument:
    """Return an instrument, locked until the commit, so that versions rise without gaps.

    Raises:
        NotFound: there is no such instrument.
    """
    instrument = session.get(Instrument, instrument_id, with_for_update=True)
    if instrument is None:
        raise NotFound("There is no such instrument.", field="instrument_id")
    return instrument


def keep_calibration(
    session: Session,
    instrument: Instrument,
    papers: Papers,
    kept: Kept,
    *,
    act: str,
    actor: Actor,
    now: datetime,
) -> str:
    """Keep a calibration as the version that serves from now on; return its id.

    Raises:
        Unacceptable: a day that cannot be, a missing word, an original that is not kept here.
    """
    done_on, due_on = read_day(papers.done_on, "done_on"), read_day(papers.due_on, "due_on")
    if done_on > local_day(now, actor.zone):
        raise Unacceptable("The calibration's day lies in the future.", field="done_on")
    if due_on < done_on:
        says = "The due day lies before the day of the calibration."
        raise Unacceptable(says, field="due_on", example=papers.done_on)
    original = session.get(File, kept.file_id) if kept.file_id else None
    if kept.file_id and original is None:
        raise Unacceptable("There is no such file; hand it over first.", field="file_id")
    newest = newest_calibration(session, instrument.id)
    row = Calibration(
        id=str(uuid4()),
        instrument_id=instrument.id,
        version=newest.version + 1 if newest else 1,
        certificate_number=_number(session, papers, kept, actor=actor, now=now),
        issuer=_issuer(papers, kept),
        done_on=done_on.isoformat(),
        due_at=end_of_day(due_on, actor.zone),
        due_basis=check_name(papers.due_basis, "due_basis", example="12 months, own plan"),
        document=kept.document,
        run=kept.run,
        file_id=kept.file_id,
        made_by=actor.person_id,
        made_at=now,
    )
    session.add(row)
    session.flush()
    body: dict[str, Any] = {
        "calibration": row.id,
        "version": row.version,
        "certificate_number": row.certificate_number,
        "done_on": row.done_on,
        "due_on": due_on.isoformat(),
        "document": row.document,
    }
    if kept.run is not None:
        told = {"sha256": digest(canonical(kept.run)), "verdict": kept.run.get("verdict")}
        body["run"] = told
    if original is not None:
        body["file"] = {"id": original.id, "name": original.name, "sha256": original.sha256}
    thing = Thing("instrument", instrument.id, instrument.name)
    note_act(session, act, thing, actor=actor, now=now, why=kept.reason, body=body)
    return row.id


def _number(session: Session, papers: Papers, kept: Kept, *, actor: Actor, now: datetime) -> str:
    if kept.run is not None and not papers.certificate_number.strip():
        year = local_day(now, actor.zone).year
        return f"R-{year}-{next_number(session, f'run {year}'):04d}"
    return check_name(papers.certificate_number, "certificate_number", example="C-2026-118")


def _issuer(papers: Papers, kept: Kept) -> str:
    if kept.run is not None and not papers.issuer.strip():
        return OWN
    return check_name(papers.issuer, "issuer", example="calibration laboratory")
