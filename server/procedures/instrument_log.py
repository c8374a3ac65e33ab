"""The log of an instrument: limits of its checks, checks, drop volumes; in ink."""

from dataclasses import dataclass, field
from datetime import datetime
from typing import Any

from sqlalchemy.orm import Session

from server.lab.actor import Actor
from server.lab.calibration.check_log import (
    CHART_OF_KIND,
    CHECK_OF_KIND,
    DROP_VOLUME,
    chart_of,
    judge_line,
    need_chart,
)
from server.lab.calibration.drop import judge_drop
from server.lab.free_text import read_text
from server.lab.refusal import NotAllowed, Unacceptable
from server.lab.roles import Act
from server.lab.sheet_facts import BURETTE, LogFact, PersonFact
from server.procedures.acts import Thing
from server.procedures.calibration_papers import locked_instrument
from server.procedures.calibration_runs import weighed_with
from server.procedures.log import strike_line, write_line
from server.records.queries.list_log import log_lines
from server.records.queries.load_used import used_for_run
from server.records.tables.stores import Instrument

_KIND = "instrument"
_MOST_REMARK = 500


@dataclass(frozen=True, slots=True)
class SetLimits:
    """The limits of an instrument's checks: a check weight of a balance, a check buffer of a probe.

    A balance: ``name``, ``step``, and ``first`` readings (5 at least) or ``centre``, ``warning``
    and ``action`` in g. A probe: ``set``, ``buffer``, ``warning`` and ``action`` in pH.
    """

    instrument_id: str
    document: dict[str, Any]


@dataclass(frozen=True, slots=True)
class WriteCheck:
    """One check. ``reading`` in g of a balance; ``pH`` and ``temperature`` in °C of a probe.

    ``chart`` is the line of its limits; empty: the only one.
    """

    instrument_id: str
    chart: str = ""
    reading: str = ""
    pH: str = ""
    temperature: str = ""
    remark: str = ""


@dataclass(frozen=True, slots=True)
class StrikeLine:
    """A line of an instrument's log to be struck through, with the reason."""

    instrument_id: str
    line_id: str
    reason: str


@dataclass(frozen=True, slots=True)
class MeasureDrop:
    """The volume of a burette's drop: a run whose weighings are of ``drops`` drops each."""

    instrument_id: str
    drops: int
    run: dict[str, Any] = field(default_factory=dict)
    balance_id: str = ""
    thermometer_id: str = ""
    room_id: str = ""


def set_limits(session: Session, command: SetLimits, *, actor: Actor, now: datetime) -> str:
    """Set the limits of a check; return the line's id. Of one name the newest limits count.

    Raises:
        Unacceptable: an instrument that has no checks, limits that cannot be.
    """
    actor.need(Act.KEEP)
    row = locked_instrument(session, command.instrument_id)
    what = CHART_OF_KIND.get(row.kind)
    if what is None:
        says = f"A {row.kind} has no check of its own between two calibrations."
        raise Unacceptable(says, field="instrument_id")
    chart_of(_line_to_be(what, command.document, actor=actor, now=now))
    return write_line(
        session, _thing(row), what, command.document,
        act="set limits of a check", actor=actor, now=now,
    )  # fmt: skip


def write_check(session: Session, command: WriteCheck, *, actor: Actor, now: datetime) -> str:
    """Write a check down, whatever it says; return the line's id.

    Raises:
        Unacceptable: no limits are set yet, or the reading is no number.
    """
    actor.need(Act.LOG)
    row = locked_instrument(session, command.instrument_id)
    what = CHECK_OF_KIND.get(row.kind)
    if what is None:
        says = f"A {row.kind} has no check of its own between two calibrations."
        raise Unacceptable(says, field="instrument_id")
    log = log_lines(session, _KIND, [row.id]).get(row.id, ())
    chart = need_chart(log, row.kind, command.chart)
    typed = {
        "chart": chart.line.id,
        "reading": command.reading,
        "temperature": command.temperature,
        "pH": command.pH,
        "remark": read_text(command.remark, "remark", most=_MOST_REMARK),
    }
    document = {key: value for key, value in typed.items() if value}
    judge_line(chart, _line_to_be(what, document, actor=actor, now=now), ())
    act = f"wrote a {what}"
    return write_line(session, _thing(row), what, document, act=act, actor=actor, now=now)


def strike_check(session: Session, command: StrikeLine, *, actor: Actor, now: datetime) -> None:
    """Strike a line of an instrument's log through; it stays readable.

    Limits are struck by a keeper, checks by whoever writes them.
    """
    actor.need(Act.LOG)
    row = locked_instrument(session, command.instrument_id)
    struck = strike_line(
        session, _thing(row), command.line_id, command.reason, actor=actor, now=now
    )
    if struck.what in CHART_OF_KIND.values():
        actor.need(Act.KEEP)


def measure_drop(session: Session, command: MeasureDrop, *, actor: Actor, now: datetime) -> str:
    """Write the volume of a burette's drop down; return the line's id.

    Raises:
        Unacceptable: no burette, fewer than two weighings, a reading that cannot be taken.
    """
    actor.need(Act.LOG)
    row = locked_instrument(session, command.instrument_id)
    if row.kind != BURETTE:
        says = f"A {row.kind} gives no drops; a burette does."
        raise Unacceptable(says, field="instrument_id")
    used = used_for_run(session, row.kind, weighed_with(command), now=now, zone=actor.zone)
    drop = judge_drop(command.run, command.drops, used)
    document = {
        "drops": str(command.drops),
        "typed": command.run,
        "used": [one.to_document() for one in used],
        "volume": {"value": drop.volume_text, "unit": "mL", "u": drop.u_text},
        "weighings": str(drop.weighings),
    }
    return write_line(
        session, _thing(row), DROP_VOLUME, document,
        act="measured a drop's volume", actor=actor, now=now,
    )  # fmt: skip


def _thing(row: Instrument) -> Thing:
    return Thing(_KIND, row.id, row.name)


def _line_to_be(what: str, document: dict[str, Any], *, actor: Actor, now: datetime) -> LogFact:
    """Return a line as it will stand, to be judged before it is written."""
    if not isinstance(document, dict):
        raise NotAllowed("document must be an object.", field="document")
    by = PersonFact(actor.person_id, actor.printed_name, actor.initials)
    return LogFact("", what, document, by, now)
