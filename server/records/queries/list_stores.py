"""Recipes and instruments in lists, in a fixed number of selects."""

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import datetime, timedelta

from sqlalchemy import bindparam, func, select
from sqlalchemy.orm import Session

from server.lab.calibration.check_log import CHARTS
from server.lab.sheet_facts import HoldFact, InstrumentFact, LogFact
from server.records.queries.by_ids import IDS, any_of
from server.records.queries.list_log import log_lines
from server.records.queries.load_files import FileFact, file_fact, file_facts
from server.records.tables.people import Person
from server.records.tables.stores import Calibration, Hold, Instrument, Recipe

#: A check between two calibrations that is older says nothing about today.
CHECK_SPAN = timedelta(days=31)
_HOLDS = (
    select(Hold)
    .where(Hold.kind == bindparam("kind"), Hold.thing_id.in_(any_of()))
    .order_by(Hold.held_at, Hold.id)
)


@dataclass(frozen=True, slots=True)
class ListedInstrument:
    """An instrument; ``fact`` holds its serving calibration and is None where it has none."""

    instrument: Instrument
    fact: InstrumentFact | None


@dataclass(frozen=True, slots=True)
class KeptCalibration:
    """A calibration with who recorded it, and its original where there is one."""

    row: Calibration
    recorded_by: str
    file: FileFact | None = None


def listed_instruments(
    session: Session, *, since: datetime | None = None
) -> list[ListedInstrument]:
    """Return the instruments, each with the calibration that serves, by kind and name.

    ``since``: with the checks of each from then on; None: without.
    """
    newest = (
        select(Calibration.instrument_id, func.max(Calibration.version).label("version"))
        .group_by(Calibration.instrument_id)
        .subquery()
    )
    rows = session.execute(
        select(Instrument, Calibration)
        .outerjoin(newest, newest.c.instrument_id == Instrument.id)
        .outerjoin(
            Calibration,
            (Calibration.instrument_id == Instrument.id)
            & (Calibration.version == newest.c.version),
        )
        .order_by(Instrument.kind, Instrument.name)
    ).all()
    ids = [row.id for row, _ in rows]
    holds = holds_by_thing(session, "instrument", ids)
    logs = {} if since is None else checks_since(session, ids, since)
    return [
        ListedInstrument(
            row,
            instrument_fact(row, calibration, holds.get(row.id, ()), logs.get(row.id, ()))
            if calibration
            else None,
        )
        for row, calibration in rows
    ]


def checks_since(
    session: Session, instrument_ids: Sequence[str], since: datetime
) -> dict[str, tuple[LogFact, ...]]:
    """Return the charts of instruments, and the checks on them from an instant on.

    Where there is none on a chart since then, all there are: waiting does not heal a failed one.
    """
    found = log_lines(session, "instrument", instrument_ids, since=since, always=CHARTS)
    quiet = [key for key, lines in found.items() if _is_quiet(lines)]
    return {**found, **log_lines(session, "instrument", quiet)} if quiet else found


def _is_quiet(lines: Sequence[LogFact]) -> bool:
    names = ("name", "set", "buffer")
    charts = {
        tuple(one.document.get(key) for key in names): one.id
        for one in lines
        if one.what in CHARTS and one.struck is None
    }
    return not set(charts.values()) <= {one.document.get("chart") for one in lines}


def calibrations_of(session: Session, instrument_id: str) -> list[KeptCalibration]:
    """Return the calibrations of an instrument, the newest first."""
    rows = session.execute(
        select(Calibration, Person.printed_name)
        .join(Person, Person.id == Calibration.made_by)
        .where(Calibration.instrument_id == instrument_id)
        .order_by(Calibration.version.desc())
    )
    found = [(row, name) for row, name in rows]
    files = file_facts(session, [row.file_id for row, _ in found if row.file_id])
    return [KeptCalibration(row, name, files.get(row.file_id or "")) for row, name in found]


def calibration_of(
    session: Session, instrument_id: str, version: int
) -> tuple[KeptCalibration, int] | None:
    """Return one version of an instrument's calibration and the newest version's number."""
    asked = (
        select(Calibration, Person.printed_name)
        .join(Person, Person.id == Calibration.made_by)
        .where(Calibration.instrument_id == instrument_id, Calibration.version == version)
    )
    found = session.execute(asked).first()
    if found is None:
        return None
    row, name = found
    of_one = select(func.max(Calibration.version)).where(Calibration.instrument_id == instrument_id)
    newest = session.scalar(of_one) or version
    return KeptCalibration(row, name, file_fact(session, row.file_id)), newest


def newest_recipes(session: Session) -> list[Recipe]:
    """Return the newest version of each recipe, by name."""
    newest = (
        select(Recipe.name, func.max(Recipe.version).label("version"))
        .group_by(Recipe.name)
        .subquery()
    )
    rows = select(Recipe).join(
        newest, (newest.c.name == Recipe.name) & (newest.c.version == Recipe.version)
    )
    return list(session.scalars(rows.order_by(Recipe.name)))


def recipe_versions(session: Session, name: str) -> list[Recipe]:
    """Return all versions of a recipe, the newest first."""
    rows = select(Recipe).where(Recipe.name == name).order_by(Recipe.version.desc())
    return list(session.scalars(rows))


def holds_by_thing(
    session: Session, kind: str, thing_ids: Sequence[str]
) -> dict[str, tuple[HoldFact, ...]]:
    """Return all holds of some things of one kind, oldest first, by the thing."""
    rows = session.scalars(_HOLDS, {"kind": kind, IDS: list(thing_ids)})
    found: dict[str, tuple[HoldFact, ...]] = {}
    for row in rows:
        one = HoldFact(row.held_at, row.released_at, row.reason)
        found[row.thing_id] = (*found.get(row.thing_id, ()), one)
    return found


def instrument_fact(
    row: Instrument,
    calibration: Calibration,
    holds: tuple[HoldFact, ...],
    log: tuple[LogFact, ...] = (),
) -> InstrumentFact:
    """Return an instrument's row with one of its calibrations as a plain value."""
    checks = (calibration.run or {}).get("checks", ())
    return InstrumentFact(
        kind=row.kind,
        instrument_id=row.id,
        name=row.name,
        identity=row.document,
        calibration_id=calibration.id,
        version=calibration.version,
        certificate_number=calibration.certificate_number,
        issuer=calibration.issuer,
        done_on=calibration.done_on,
        due_at=calibration.due_at,
        due_basis=calibration.due_basis,
        document=calibration.document,
        holds=holds,
        failing=tuple(one["says"] for one in checks if one["verdict"] == "fails"),
        log=log,
        recorded_at=calibration.made_at,
    )
