"""The columns of curves' tables as instruments wrote them last."""

from collections.abc import Mapping
from dataclasses import dataclass
from datetime import datetime
from typing import Any

from sqlalchemy import select
from sqlalchemy.orm import Session

from server.lab.sheet_facts import BURETTE, PROBE
from server.records.tables.bench import Sheet
from server.records.tables.stores import Calibration, CurveColumns, Instrument


@dataclass(frozen=True, slots=True)
class CurveSource:
    """Whose files a sheet's curves are: probe before burette; None where it uses neither.

    ``columns`` is the document that was remembered; ``burette`` the name of what counts drops.
    """

    instrument_id: str | None
    burette: str | None
    columns: Mapping[str, Any] | None


def curve_source(session: Session, sheet: Sheet) -> CurveSource:
    """Return the instrument whose columns are remembered for a sheet's curves, and what is."""
    wanted = {
        kind: sheet.calibrations[kind] for kind in (PROBE, BURETTE) if kind in sheet.calibrations
    }
    found = {
        row.id: (instrument_id, name)
        for row, instrument_id, name in session.execute(
            select(Calibration, Instrument.id, Instrument.name)
            .join(Instrument, Instrument.id == Calibration.instrument_id)
            .where(Calibration.id.in_(list(wanted.values())))
        )
    }
    named = {kind: found[one] for kind, one in wanted.items() if one in found}
    instrument_id = next((named[kind][0] for kind in (PROBE, BURETTE) if kind in named), None)
    kept = session.get(CurveColumns, instrument_id) if instrument_id else None
    return CurveSource(
        instrument_id=instrument_id,
        burette=named[BURETTE][1] if BURETTE in named else None,
        columns=kept.document if kept else None,
    )


def remember_columns(
    session: Session, source: CurveSource, document: Mapping[str, Any], *, person_id: str,
    now: datetime,
) -> None:  # fmt: skip
    """Keep how an instrument's file had its columns, where that is new."""
    if source.instrument_id is None or document == source.columns:
        return
    session.merge(
        CurveColumns(
            instrument_id=source.instrument_id,
            document=dict(document),
            person_id=person_id,
            at=now,
        )
    )
    session.flush()
