"""The instruments, and one with its calibrations."""

from collections.abc import Mapping
from datetime import datetime
from typing import Any

from sqlalchemy.orm import Session

from server.lab.actor import Actor
from server.lab.refusal import NotFound
from server.lab.roles import Act
from server.lab.sheet_facts import BALANCE, BURETTE
from server.lab.states import DUE_SOON, HELD, IN_DATE, LAPSED, REPLACED, due_state
from server.records.queries.list_holds import standing_holds
from server.records.queries.list_stores import (
    KeptCalibration,
    ListedInstrument,
    calibrations_of,
    listed_instruments,
)
from server.records.queries.load_papers import load_people
from server.records.tables.stores import Instrument
from server.sheets.parts.doors import may_hold, may_release, need_reader
from server.sheets.parts.shelf_state import held_says
from server.sheets.parts.telling import (
    last_day_words,
    moment_words,
    quantity_words,
    typed_day_words,
)
from server.sheets.stores import (
    CalibrationView,
    ErrorTable,
    Fact,
    InstrumentPage,
    Instruments,
    StoreLine,
)

NOT_CALIBRATED = "not calibrated"
_ORDER = (DUE_SOON, IN_DATE, HELD, LAPSED, NOT_CALIBRATED)
_KIND = "instrument"
_IDENTITY = {
    "maker": "Maker",
    "type": "Type",
    "serial": "Serial number",
    "location": "Where it stands",
    "resolution": "Resolution",
    "capacity": "Capacity",
    "decimals": "Decimals of a reading",
    "minimum_g": "Smallest mass",
    "software": "Software version",
}
_UNITS = {BALANCE: "g", BURETTE: "mL", "thermometer": "°C"}
_STATED = {
    "linearity": "Linearity of one reading",
    "error_u": "Uncertainty of the errors",
    "capacity": "Capacity",
    "delivery": "Bound of one delivered volume",
    "glass_expansion": "Cubic expansion of the glass",
    "reading": "One reading",
    "temperature": "Air temperature",
    "pressure": "Air pressure",
    "humidity": "Relative humidity",
}
_TABLES = {
    BALANCE: ("Errors of indication", ("load, g", "error, g")),
    BURETTE: ("Errors of reading", ("reading, mL", "error, mL")),
}


def open_instruments(session: Session, *, actor: Actor | None, now: datetime) -> Instruments:
    """Return the instruments by state, due soonest first in each.

    Raises:
        NotSignedIn: a visitor.
    """
    reader = need_reader(actor)
    listed = listed_instruments(session)
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
    row = session.get(Instrument, instrument_id)
    if row is None:
        raise NotFound("There is no such instrument.", field="instrument_id")
    hold = standing_holds(session, (_KIND,), thing_ids=(row.id,)).get((_KIND, row.id))
    kept = calibrations_of(session, row.id)
    by = load_people(session, (row.made_by,))[row.made_by].printed_name
    registered = Fact("Registered", f"{moment_words(row.made_at, reader.zone)} by {by}")
    due_at = kept[0].row.due_at if kept else None
    return InstrumentPage(
        id=row.id,
        kind=row.kind,
        name=row.name,
        state=_state(due_at, now, held=hold is not None),
        held_says=held_says(hold, row.kind, reader.zone),
        facts=(*_identity(row), registered),
        calibrations=tuple(
            _calibration(row.kind, one, now, reader.zone, serves=place == 0)
            for place, one in enumerate(kept)
        ),
        may_keep=reader.may(Act.KEEP),
        may_hold=may_hold(reader, hold),
        may_release=may_release(reader, hold),
    )


def _state(due_at: datetime | None, now: datetime, *, held: bool) -> str:
    if due_at is None:
        return HELD if held else NOT_CALIBRATED
    return due_state(due_at=due_at, held=held, now=now)


def _line(one: ListedInstrument, now: datetime, zone: str, *, held: bool) -> StoreLine:
    row, fact = one.instrument, one.fact
    about = (row.document.get("type"), row.document.get("location"))
    return StoreLine(
        id=row.id,
        url=f"/instruments/{row.id}",
        kind=row.kind,
        name=row.name,
        says=", ".join(part for part in about if part),
        state=_state(fact.due_at if fact else None, now, held=held),
        due=last_day_words(fact.due_at, zone) if fact else "",
        certificate=fact.certificate_number if fact else "",
    )


def _identity(row: Instrument) -> list[Fact]:
    unit = _UNITS.get(row.kind, "")
    units = {"resolution": unit, "capacity": unit, "minimum_g": "g"}
    return [
        Fact(label, f"{row.document[key]} {units.get(key, '')}".strip())
        for key, label in _IDENTITY.items()
        if row.document.get(key)
    ]


def _calibration(
    kind: str, one: KeptCalibration, now: datetime, zone: str, *, serves: bool
) -> CalibrationView:
    row = one.row
    recorded = Fact("Recorded", f"{moment_words(row.made_at, zone)} by {one.recorded_by}")
    return CalibrationView(
        version=row.version,
        certificate=row.certificate_number,
        issuer=row.issuer,
        done_on=typed_day_words(row.done_on),
        due=last_day_words(row.due_at, zone),
        due_basis=row.due_basis,
        state=_state(row.due_at, now, held=False) if serves else REPLACED,
        facts=(*_stated(row.document), recorded),
        table=_table(kind, row.document),
        serves=serves,
    )


def _stated(document: Mapping[str, Any]) -> list[Fact]:
    facts = []
    for key, label in _STATED.items():
        stated = document.get(key)
        if isinstance(stated, Mapping):
            facts.append(Fact(label, quantity_words(stated)))
        elif stated:
            facts.append(Fact(label, f"{stated} /K"))
    return facts


def _table(kind: str, document: Mapping[str, Any]) -> ErrorTable | None:
    rows = document.get("error_table")
    if not rows or kind not in _TABLES:
        return None
    caption, heads = _TABLES[kind]
    return ErrorTable(caption, heads, tuple(tuple(str(cell) for cell in row) for row in rows))
