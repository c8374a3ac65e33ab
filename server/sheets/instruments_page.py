"""The instruments, and one with its calibrations and the checks between them."""

from datetime import datetime

from sqlalchemy.orm import Session

from server.chemistry.buffers import buffer_names, buffer_sets
from server.lab.actor import Actor
from server.lab.calibration.check_log import CHART_OF_KIND, CHECK_OF_KIND
from server.lab.calibration.run import KINDS, WARE_OF_KIND
from server.lab.identity import DESCRIBED
from server.lab.in_use import flag_of
from server.lab.refusal import NotFound
from server.lab.roles import Act
from server.lab.sheet_facts import PROBE
from server.lab.states import DUE_SOON, HELD, IN_DATE, LAPSED, due_state
from server.records.queries.list_holds import hold_history, standing_holds
from server.records.queries.list_log import log_lines
from server.records.queries.list_stores import (
    CHECK_SPAN,
    ListedInstrument,
    calibration_of,
    calibrations_of,
    instrument_fact,
    listed_instruments,
)
from server.records.queries.load_papers import load_people
from server.records.tables.stores import Instrument
from server.sheets.instruments import (
    CalibrationPage,
    InstrumentLine,
    InstrumentPage,
    Instruments,
)
from server.sheets.parts.calibration_views import calibration_view, run_view
from server.sheets.parts.check_charts import chart_views, line_views
from server.sheets.parts.doors import may_hold, may_release, need_reader
from server.sheets.parts.identity import identity_fields, scale_facts
from server.sheets.parts.past_holds import hold_words
from server.sheets.parts.shelf_state import held_says
from server.sheets.parts.telling import due_words, last_day_words, moment_words
from server.sheets.stores import Fact

NOT_CALIBRATED = "not calibrated"
_ORDER = (DUE_SOON, IN_DATE, HELD, LAPSED, NOT_CALIBRATED)
_KIND = "instrument"


def open_instruments(session: Session, *, actor: Actor | None, now: datetime) -> Instruments:
    """Return the instruments by state, due soonest first in each.

    Raises:
        NotSignedIn: a visitor.
    """
    reader = need_reader(actor)
    listed = listed_instruments(session, since=now - CHECK_SPAN)
    held = {key[1] for key in standing_holds(session, (_KIND,))}
    lines = [_line(one, now, reader.zone, held=one.instrument.id in held) for one in listed]
    return Instruments(
        instruments=tuple(sorted(lines, key=lambda line: _ORDER.index(line.state))),
        may_keep=reader.may(Act.KEEP),
    )


def open_instrument(
    session: Session, instrument_id: str, *, actor: Actor | None, now: datetime
) -> InstrumentPage:
    """Return one instrument with its calibrations, the newest, which serves, first.

    Raises:
        NotFound: there is no such instrument.
        NotSignedIn: a visitor.
    """
    reader = need_reader(actor)
    row, zone = find_instrument(session, instrument_id), reader.zone
    hold = standing_holds(session, (_KIND,), thing_ids=(row.id,)).get((_KIND, row.id))
    kept = calibrations_of(session, row.id)
    log = log_lines(session, _KIND, [row.id]).get(row.id, ())
    by = load_people(session, (row.made_by,))[row.made_by].printed_name
    registered = Fact("Registered", f"{moment_words(row.made_at, zone)} by {by}")
    newest = kept[0].row if kept else None
    fact = instrument_fact(row, newest, (), log) if newest else None
    return InstrumentPage(
        id=row.id,
        kind=row.kind,
        name=row.name,
        state=_state(newest.due_at if newest else None, now, held=hold is not None),
        due=last_day_words(newest.due_at, zone) if newest else "",
        due_in=due_words(newest.due_at, now, zone) if newest else "",
        due_basis=newest.due_basis if newest else "",
        held_says=held_says(hold, row.kind, zone),
        flag=flag_of(fact, at=now, zone=zone) if fact else "",
        identity=identity_fields(row.name, row.kind, row.document, kept, zone),
        described={key: row.document.get(key, "") for key in DESCRIBED},
        facts=(*scale_facts(row.kind, row.document), registered),
        calibrations=tuple(
            calibration_view(row.kind, row.name, one, now=now, zone=zone, serves=place == 0)
            for place, one in enumerate(kept)
        ),
        check=CHECK_OF_KIND.get(row.kind, ""),
        limits=CHART_OF_KIND.get(row.kind, ""),
        charts=chart_views(log, row.kind, zone),
        lines=line_views(log, row.kind, reader),
        holds=tuple(hold_words(one, zone) for one in hold_history(session, _KIND, row.id)),
        buffers=buffers_by_set() if row.kind == PROBE else (),
        runs_here=row.kind in KINDS,
        has_class=row.kind in WARE_OF_KIND,
        may_keep=reader.may(Act.KEEP),
        may_log=reader.may(Act.LOG),
        may_hold=may_hold(reader, hold),
        may_release=may_release(reader, hold),
    )


def open_calibration(
    session: Session, instrument_id: str, version: int, *, actor: Actor | None, now: datetime
) -> CalibrationPage:
    """Return one calibration of an instrument, with the readings that it came from.

    Raises:
        NotFound: there is no such instrument or version.
        NotSignedIn: a visitor.
    """
    reader = need_reader(actor)
    row = find_instrument(session, instrument_id)
    found = calibration_of(session, row.id, version)
    if found is None:
        raise NotFound("There is no such calibration.", field="version")
    kept, newest = found
    serves = kept.row.version == newest
    return CalibrationPage(
        id=row.id,
        kind=row.kind,
        name=row.name,
        calibration=calibration_view(
            row.kind, row.name, kept, now=now, zone=reader.zone, serves=serves
        ),
        run=run_view(row.name, kept.row.run) if kept.row.run else None,
    )


def find_instrument(session: Session, instrument_id: str) -> Instrument:
    """Return an instrument's row.

    Raises:
        NotFound: there is no such instrument.
    """
    row = session.get(Instrument, instrument_id)
    if row is None:
        raise NotFound("There is no such instrument.", field="instrument_id")
    return row


def buffers_by_set() -> tuple[tuple[str, tuple[str, ...]], ...]:
    """Return the sets of buffers that come with the program, each with its buffers."""
    return tuple((name, buffer_names(name)) for name in buffer_sets())


def _state(due_at: datetime | None, now: datetime, *, held: bool) -> str:
    if due_at is None:
        return HELD if held else NOT_CALIBRATED
    return due_state(due_at=due_at, held=held, now=now)


def _line(one: ListedInstrument, now: datetime, zone: str, *, held: bool) -> InstrumentLine:
    row, fact = one.instrument, one.fact
    about = (row.document.get("type"), row.document.get("location"))
    return InstrumentLine(
        id=row.id,
        url=f"/instruments/{row.id}",
        kind=row.kind,
        name=row.name,
        says=", ".join(part for part in about if part),
        state=_state(fact.due_at if fact else None, now, held=held),
        due=last_day_words(fact.due_at, zone) if fact else "",
        due_in=due_words(fact.due_at, now, zone) if fact else "",
        due_basis=fact.due_basis if fact else "",
        certificate=fact.certificate_number if fact else "",
        flag=flag_of(fact, at=now, zone=zone) if fact else "",
    )
