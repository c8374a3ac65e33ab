"""What the trail tells of a sheet's way: its last act, and how often it was sent back."""

import json
from collections.abc import Sequence

from sqlalchemy import func, select
from sqlalchemy.orm import Session

from server.lab.sheet_facts import ReturnFact, RowRemark
from server.records.queries.by_ids import IDS, rows_by
from server.records.tables.trail import TrailRow

SENT_BACK_ACT = "sent back a bench sheet"
_RETURNS = rows_by(TrailRow.thing_id, TrailRow.seq).where(
    TrailRow.kind == "sheet", TrailRow.act == SENT_BACK_ACT
)


def last_act_of_sheet(session: Session, sheet_id: str) -> int:
    """Return the number of the last act on a sheet, 0 where there is none."""
    last = select(func.max(TrailRow.seq))
    return session.scalar(last.where(TrailRow.kind == "sheet", TrailRow.thing_id == sheet_id)) or 0


def load_returns(session: Session, sheet_ids: Sequence[str]) -> dict[str, list[ReturnFact]]:
    """Return for each sheet every time that it was sent back, oldest first, with the remarks."""
    rows = session.scalars(_RETURNS, {IDS: list(sheet_ids)})
    found: dict[str, list[ReturnFact]] = {}
    for row in rows:
        found.setdefault(row.thing_id, []).append(_return(row))
    return found


def _return(row: TrailRow) -> ReturnFact:
    """Return a sending back as noted; an earlier release noted one remark only, as the reason."""
    body = json.loads(row.body)
    rows = tuple(
        RowRemark(one["replicate"], one["slot"], one["text"], one["segment"])
        for one in body.get("remarks", ())
    )
    return ReturnFact(
        at=row.at,
        by=row.person_name or "",
        remark=body.get("remark", row.why or ""),
        rows=rows,
    )
