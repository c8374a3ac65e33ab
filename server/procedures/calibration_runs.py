"""Calibrations done here, reading by reading, and class tolerances that serve without one."""

from dataclasses import dataclass
from datetime import datetime
from decimal import Decimal
from typing import Any

from sqlalchemy.orm import Session

from server.lab.actor import Actor
from server.lab.calibration.run import WARE_OF_KIND, JudgedRun, judge_run
from server.lab.calibration.typed_numbers import number_at, optional_number
from server.lab.calibration.ware_verdict import class_statement
from server.lab.free_text import MOST_REASON, read_text
from server.lab.papers import read_calibration
from server.lab.refusal import Unacceptable
from server.lab.roles import Act
from server.procedures.calibration_papers import (
    Kept,
    Papers,
    keep_calibration,
    locked_instrument,
)
from server.records.queries.load_used import USED_FIELDS, used_for_run

#: The format of a run as it is kept beside its calibration.
RUN_FORMAT = "calibration-run/1"


@dataclass(frozen=True, slots=True)
class RecordRun:
    """A calibration done here. ``run`` is the document of its readings as typed.

    Ware is weighed with a balance of the house, a thermometer and a room monitor where they are
    named: their corrections and uncertainties count. An empty number or issuer is filled in here.
    ``reason`` is why a run of which something fails shall serve.
    """

    instrument_id: str
    run: dict[str, Any]
    done_on: str
    due_on: str
    due_basis: str
    certificate_number: str = ""
    issuer: str = ""
    balance_id: str = ""
    thermometer_id: str = ""
    room_id: str = ""
    reason: str = ""


@dataclass(frozen=True, slots=True)
class StateClass:
    """A class tolerance that serves without a run: ware of a nominal volume and class.

    ``nominal`` in mL; ``grade`` A, AS or B, empty for piston-operated ware; ``division`` in mL of a
    burette's marks; ``shape`` triangular as QUAM takes it, rectangular where nothing is known.
    """

    instrument_id: str
    nominal: str
    done_on: str
    due_on: str
    due_basis: str
    ware: str = ""
    grade: str = ""
    division: str = ""
    glass_expansion: str = ""
    shape: str = "triangular"
    issuer: str = "maker's class mark"


def record_run(session: Session, command: RecordRun, *, actor: Actor, now: datetime) -> str:
    """Record a calibration done here as the version that serves from now on; return its id.

    Older versions stay, and what rests on them stays as it is.

    Raises:
        Unacceptable: a reading that cannot be taken, an instrument that is not in date, a run that
            fails without a reason to let it serve.
    """
    actor.need(Act.KEEP)
    instrument = locked_instrument(session, command.instrument_id)
    used = used_for_run(session, instrument.kind, weighed_with(command), now=now, zone=actor.zone)
    judged = judge_run(instrument.kind, command.run, used)
    reason = read_text(command.reason, "reason", most=MOST_REASON)
    _need_reason(judged, reason)
    papers = Papers(
        certificate_number=command.certificate_number,
        issuer=command.issuer,
        done_on=command.done_on,
        due_on=command.due_on,
        due_basis=command.due_basis,
    )
    run = {
        "format": RUN_FORMAT,
        "typed": command.run,
        "used": [one.to_document() for one in used],
        "checks": [one.to_document() for one in judged.checks],
        "told": judged.told.to_document(),
        "verdict": judged.verdict,
        "reason": reason,
    }
    return keep_calibration(
        session, instrument, papers, Kept(judged.document, run=run, reason=reason),
        act="calibrated an instrument", actor=actor, now=now,
    )  # fmt: skip


def state_class(session: Session, command: StateClass, *, actor: Actor, now: datetime) -> str:
    """Let a class tolerance serve, as a calibration that says so; return its id.

    Raises:
        Unacceptable: no volumetric ware, or no table has this class or volume.
    """
    actor.need(Act.KEEP)
    instrument = locked_instrument(session, command.instrument_id)
    wares = WARE_OF_KIND.get(instrument.kind)
    if wares is None:
        says = f"A {instrument.kind} has no class tolerance: calibrate it."
        raise Unacceptable(says, field="instrument_id")
    ware = command.ware or wares[0]
    if ware not in wares:
        says = f"ware cannot be “{ware[:40]}”; it is {' or '.join(wares)}."
        raise Unacceptable(says, field="ware", example=wares[0])
    given = {"nominal": command.nominal, "division": command.division}
    nominal = number_at(given, "nominal", "", example="10", low="0.0001", high="10000")
    division = optional_number(given, "division", "", example="0.05", low="0")
    try:
        document = class_statement(
            ware,
            nominal,
            grade=command.grade or None,
            division=division,
            glass_expansion=command.glass_expansion or None,
            shape=command.shape,
        )
    except Unacceptable as problem:
        field = {"class": "grade", "kind": "ware"}.get(problem.field or "", problem.field)
        raise Unacceptable(problem.says, field=field, example=problem.example) from problem
    grade = f"class {command.grade}" if command.grade else "type tolerance"
    papers = Papers(
        certificate_number=f"{grade}, {_plain(nominal)} mL",
        issuer=command.issuer,
        done_on=command.done_on,
        due_on=command.due_on,
        due_basis=command.due_basis,
    )
    return keep_calibration(
        session, instrument, papers, Kept(read_calibration(instrument.kind, document)),
        act="let a class tolerance serve", actor=actor, now=now,
    )  # fmt: skip


def weighed_with(command: Any) -> dict[str, str]:
    """Return the instruments that a command names for the weighing, by kind."""
    return {kind: getattr(command, field) for kind, field in USED_FIELDS.items()}


def _need_reason(judged: JudgedRun, reason: str) -> None:
    failing = [one for one in judged.checks if one.verdict == "fails"]
    if failing and not reason:
        says = (
            f"It fails: {'; '.join(one.name for one in failing)}. To let it serve all the same, "
            "give the reason: it is shown wherever the instrument is picked."
        )
        shown = {"checks": [one.to_document() for one in judged.checks]}
        raise Unacceptable(says, field="reason", example="used with its corrections", shown=shown)


def _plain(number: Decimal) -> str:
    return f"{number.normalize():f}"
