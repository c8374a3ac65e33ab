"""Watches of bottles and lots, and the facts from which their changes follow."""

import json
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from datetime import UTC, datetime
from typing import TypeVar

from sqlalchemy import select
from sqlalchemy.orm import Session

from server.lab.watching import Doubt, History, Stated
from server.records.tables.bench import Certificate
from server.records.tables.lots import Bottle, Lot, Pull
from server.records.tables.people import Person
from server.records.tables.shelf import Mailbox, Watch
from server.records.tables.stores import Hold

LOT, BOTTLE = "lot", "bottle"
_BEGINNING = datetime(1970, 1, 1, tzinfo=UTC)
Row = TypeVar("Row", Lot, Bottle)


@dataclass(frozen=True, slots=True)
class Watched:
    """A watch with what it is on, and what became of that; ``bottle`` is None for a lot."""

    watch: Watch
    lot: Lot
    bottle: Bottle | None
    history: History


@dataclass(frozen=True, slots=True)
class Posted:
    """A standing watch of somebody who wants letters, and since when."""

    watched: Watched
    address: str
    since: datetime


def standing_watch(session: Session, person_id: str, kind: str, thing_id: str) -> Watch | None:
    """Return a person's watch of a thing, None where she does not watch it."""
    return session.scalar(
        select(Watch).where(
            Watch.person_id == person_id,
            Watch.kind == kind,
            Watch.thing_id == thing_id,
            Watch.ended_at.is_(None),
        )
    )


def watches_of(session: Session, person_id: str) -> Sequence[Watch]:
    """Return all watches of a person, ended ones among them, begun last first."""
    return session.scalars(
        select(Watch).where(Watch.person_id == person_id).order_by(Watch.began_at.desc(), Watch.id)
    ).all()


def mailbox_of(session: Session, person_id: str) -> Mailbox | None:
    """Return a person's mailbox, None before she used it."""
    return session.get(Mailbox, person_id)


def posted_watches(session: Session) -> list[Posted]:
    """Return the standing watches of active people who want letters."""
    rows = session.execute(
        select(Watch, Mailbox)
        .join(Mailbox, Mailbox.person_id == Watch.person_id)
        .join(Person, Person.id == Watch.person_id)
        .where(Watch.ended_at.is_(None), Mailbox.address != "", Person.active)
        .order_by(Watch.began_at, Watch.id)
    ).all()
    boxes = {watch.id: box for watch, box in rows}
    found = watched(session, [watch for watch, _ in rows])
    return [
        Posted(
            one,
            boxes[one.watch.id].address,
            max(one.watch.began_at, boxes[one.watch.id].address_since or one.watch.began_at),
        )
        for one in found
    ]


def watched(
    session: Session, watches: Sequence[Watch], *, since: datetime | None = None
) -> list[Watched]:
    """Return watches with all that became of their things, in a fixed number of selects.

    ``since`` leaves out certificates that were no longer standing then: nothing of them is asked.
    """
    if not watches:
        return []
    bottles = _by_id(session, Bottle, _things(watches, BOTTLE))
    lot_ids = {*_things(watches, LOT), *(one.lot_id for one in bottles.values())}
    lots = _by_id(session, Lot, lot_ids)
    began = since or min(one.began_at for one in watches)
    facts = _Facts(session, lot_ids, bottles, since=began)
    found = []
    for one in watches:
        bottle = bottles.get(one.thing_id)
        lot = lots.get(bottle.lot_id if bottle else one.thing_id)
        if lot is not None:
            found.append(Watched(one, lot, bottle, facts.history(lot.id, bottle)))
    return found


def bottle_histories(session: Session, lot_id: str) -> dict[str, History]:
    """Return all that became of each bottle of a lot, by the bottle's id."""
    rows = session.scalars(select(Bottle).where(Bottle.lot_id == lot_id))
    bottles = {row.id: row for row in rows}
    facts = _Facts(session, [lot_id], bottles, since=_BEGINNING)
    return {key: facts.history(lot_id, row) for key, row in bottles.items()}


class _Facts:
    """What the histories of some lots and bottles are made of."""

    def __init__(
        self,
        session: Session,
        lot_ids: Iterable[str],
        bottles: Mapping[str, Bottle],
        *,
        since: datetime,
    ) -> None:
        ids = list(lot_ids)
        self._certificates = _certificates(session, ids, since)
        self._holds: dict[tuple[str, str], list[Hold]] = {}
        things = [*ids, *bottles]
        asked = select(Hold).where(Hold.kind.in_((LOT, BOTTLE)), Hold.thing_id.in_(things))
        for row in session.scalars(asked.order_by(Hold.held_at, Hold.id)):
            self._holds.setdefault((row.kind, row.thing_id), []).append(row)
        pulls = select(Pull).where(Pull.lot_id.in_(ids), Pull.confirmed_at.is_not(None))
        self._pulls = {row.lot_id: row for row in session.scalars(pulls)}

    def history(self, lot_id: str, bottle: Bottle | None) -> History:
        """Return what became of a lot, or of a bottle of it."""
        on_lot = self._holds.get((LOT, lot_id), [])
        own = self._holds.get((BOTTLE, bottle.id), []) if bottle else []
        pull = self._pulls.get(lot_id)
        reasons = [(row.held_at, row.reason) for row in (*on_lot, *own)]
        reasons += [
            (row.released_at, row.release_reason or "")
            for row in (*on_lot, *own)
            if row.released_at
        ]
        if pull is not None and pull.confirmed_at is not None:
            reasons.append((pull.confirmed_at, pull.reason))
        return History(
            certificates=self._certificates.get(lot_id, ()),
            lot_holds=tuple(Doubt(row.held_at, row.released_at) for row in on_lot),
            own_holds=tuple(Doubt(row.held_at, row.released_at) for row in own),
            pulled_at=pull.confirmed_at if pull else None,
            used_up_at=bottle.used_up_at if bottle else None,
            opened_at=bottle.opened_at if bottle else None,
            opened_until=bottle.opened_until if bottle else None,
            reasons=tuple(reasons),
        )


def _certificates(
    session: Session, lot_ids: Sequence[str], since: datetime
) -> dict[str, tuple[Stated, ...]]:
    """Return each lot's certificates in the order of issue, from the one that stood at ``since``.

    Their texts are long, so that only those are read that a change since then may need.
    """
    dated = session.execute(
        select(Certificate.id, Certificate.lot_id, Certificate.issued_at)
        .where(Certificate.lot_id.in_(lot_ids))
        .order_by(Certificate.issued_at, Certificate.number)
    ).all()
    stood = {row.lot_id: row.id for row in dated if row.issued_at <= since}
    needed = [row.id for row in dated if row.issued_at > since or stood[row.lot_id] == row.id]
    rows = session.scalars(
        select(Certificate)
        .where(Certificate.id.in_(needed))
        .order_by(Certificate.issued_at, Certificate.number)
    )
    found: dict[str, tuple[Stated, ...]] = {}
    for row in rows:
        document = json.loads(row.document)
        stated = Stated(
            number=row.number,
            reported=document["result"]["concentration"]["reported"],
            issued_at=row.issued_at,
            valid_until=row.valid_until,
            notice_days=document["validity"]["notice_days"],
        )
        found[row.lot_id] = (*found.get(row.lot_id, ()), stated)
    return found


def _things(watches: Iterable[Watch], kind: str) -> set[str]:
    return {one.thing_id for one in watches if one.kind == kind}


def _by_id(session: Session, table: type[Row], ids: Iterable[str]) -> dict[str, Row]:
    rows = session.scalars(select(table).where(table.id.in_(set(ids))))
    return {row.id: row for row in rows}
