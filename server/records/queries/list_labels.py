"""Labels that were printed, as the trail holds them: a row for each label of a print."""

import json
from collections.abc import Iterable
from dataclasses import dataclass
from datetime import datetime

from sqlalchemy import select
from sqlalchemy.orm import Session

from server.lab.label_print import LabelStock, LabelText, read_label_text
from server.records.tables.trail import TrailRow

LABEL_PRINTED = "printed a label"
_SOME = 500
_LAST = 2**63 - 1


@dataclass(frozen=True, slots=True)
class PrintedLabel:
    """One printed label; ``first_seq`` numbers the print that it was part of."""

    seq: int
    first_seq: int
    at: datetime
    person_name: str
    bottle_id: str
    text: LabelText
    stock: LabelStock


def labels_of_print(session: Session, first_seq: int) -> list[PrintedLabel]:
    """Return the labels of one print in their order; none where no print has this number."""
    first = session.get(TrailRow, first_seq) if 0 < first_seq <= _LAST else None
    if first is None or first.act != LABEL_PRINTED:
        return []
    body = json.loads(first.body)
    if body["place"] != 1:
        return []
    rows = session.scalars(
        select(TrailRow)
        .where(TrailRow.seq >= first_seq, TrailRow.seq < first_seq + body["of"])
        .order_by(TrailRow.seq)
    )
    return [_printed(row) for row in rows]


def labels_of_bottles(session: Session, bottle_ids: Iterable[str]) -> list[PrintedLabel]:
    """Return all labels that were printed for bottles, the newest first."""
    ids = list(bottle_ids)
    rows: list[TrailRow] = []
    for at in range(0, len(ids), _SOME):
        asked = select(TrailRow).where(
            TrailRow.act == LABEL_PRINTED, TrailRow.thing_id.in_(ids[at : at + _SOME])
        )
        rows += session.scalars(asked)
    return [_printed(row) for row in sorted(rows, key=lambda row: row.seq, reverse=True)]


def last_labels(session: Session) -> list[PrintedLabel]:
    """Return each bottle's label that was printed last, the newest first."""
    asked = select(TrailRow).where(TrailRow.act == LABEL_PRINTED).order_by(TrailRow.seq.desc())
    rows: dict[str, TrailRow] = {}
    for row in session.scalars(asked):
        rows.setdefault(row.thing_id, row)
    return [_printed(row) for row in rows.values()]


def _printed(row: TrailRow) -> PrintedLabel:
    body = json.loads(row.body)
    return PrintedLabel(
        seq=row.seq,
        first_seq=row.seq - body["place"] + 1,
        at=row.at,
        person_name=row.person_name,
        bottle_id=row.thing_id,
        text=read_label_text(body["label"]),
        stock=LabelStock(**body["onto"]),
    )
