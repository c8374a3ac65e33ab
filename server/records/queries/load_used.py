"""The instruments that a calibration run is done with, each with the calibration that serves it."""

from collections.abc import Mapping
from dataclasses import replace
from datetime import datetime

from sqlalchemy.orm import Session

from server.lab.calibration.run import KINDS, WARE_OF_KIND, UsedInstrument, used_instrument
from server.lab.in_use import judge, off_limits
from server.lab.refusal import Unacceptable
from server.lab.sheet_facts import BALANCE, ROOM, THERMOMETER
from server.lab.states import IN_DATE
from server.records.queries.list_stores import CHECK_SPAN, checks_since
from server.records.queries.load_papers import load_instrument_fact
from server.records.queries.loading import newest_calibration
from server.records.tables.stores import Instrument

#: The kinds that ware is weighed with, by the field that names one.
USED_FIELDS: Mapping[str, str] = {
    BALANCE: "balance_id", THERMOMETER: "thermometer_id", ROOM: "room_id",
}  # fmt: skip


def used_for_run(
    session: Session, kind: str, picked: Mapping[str, str], *, now: datetime, zone: str
) -> tuple[UsedInstrument, ...]:
    """Return the instruments that a run of an instrument's kind is done with, each in date now.

    ``picked`` holds ids by kind; an empty id is none.

    Raises:
        Unacceptable: a kind that is not calibrated here or not weighed; an instrument that is not
            there, not in date, held, or failed its last check.
    """
    if kind not in KINDS:
        says = f"A {kind} is calibrated elsewhere: record its certificate."
        raise Unacceptable(says, field="instrument_id")
    named = {one: key for one, key in picked.items() if key}
    if named and kind not in WARE_OF_KIND:
        field = USED_FIELDS[next(iter(named))]
        raise Unacceptable(f"A {kind} is not weighed: leave {field} empty.", field=field)
    return tuple(_used(session, one, key, now=now, zone=zone) for one, key in named.items())


def _used(
    session: Session, kind: str, instrument_id: str, *, now: datetime, zone: str
) -> UsedInstrument:
    field = USED_FIELDS[kind]
    row = session.get(Instrument, instrument_id)
    calibration = newest_calibration(session, instrument_id) if row else None
    if row is None or row.kind != kind or calibration is None:
        raise Unacceptable(f"There is no such {kind} with a calibration.", field=field)
    log = checks_since(session, [row.id], now - CHECK_SPAN).get(row.id, ())
    fact = replace(load_instrument_fact(session, calibration.id), log=log)
    state, says = judge(
        fact.name, due_at=fact.due_at, basis=fact.due_basis, holds=fact.holds,
        used_at=now, zone=zone, what="calibration",
    )  # fmt: skip
    if state != IN_DATE:
        raise Unacceptable(f"{says} Weigh with another one.", field=field)
    stopped = off_limits(fact, at=now, zone=zone)
    if stopped:
        raise Unacceptable(f"{stopped} Weigh with another one.", field=field)
    return used_instrument(fact)
