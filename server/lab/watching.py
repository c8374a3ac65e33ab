"""What became of a bottle or lot over time: its status at any instant, and every change of it.

Nothing of this is stored: a change that time makes is found like one that a person made.
"""

from collections.abc import Iterator
from dataclasses import dataclass
from datetime import datetime, timedelta

from server.lab.states import bottle_state, lot_state


@dataclass(frozen=True, slots=True)
class Stated:
    """A certificate of the lot as far as a watcher is told: its number, result and dates."""

    number: str
    reported: str
    issued_at: datetime
    valid_until: datetime
    notice_days: int


@dataclass(frozen=True, slots=True)
class Doubt:
    """A hold from its beginning to its release, None where it stands."""

    held_at: datetime
    released_at: datetime | None


@dataclass(frozen=True, slots=True)
class History:
    """All that the status of a bottle or lot follows from; of a lot, what is a bottle's is empty.

    ``certificates`` in the order of their issue. ``reasons`` says why, by the instant of the act.
    """

    certificates: tuple[Stated, ...] = ()
    lot_holds: tuple[Doubt, ...] = ()
    own_holds: tuple[Doubt, ...] = ()
    pulled_at: datetime | None = None
    used_up_at: datetime | None = None
    opened_at: datetime | None = None
    opened_until: datetime | None = None
    reasons: tuple[tuple[datetime, str], ...] = ()


@dataclass(frozen=True, slots=True)
class Status:
    """State, number and date of a bottle or lot at an instant; empty where it has none."""

    state: str
    certificate: str
    reported: str
    good_until: datetime | None


@dataclass(frozen=True, slots=True)
class Change:
    """One change: when, from what, to what, and why where somebody gave a reason."""

    at: datetime
    before: Status
    after: Status
    why: str


def status_at(history: History, at: datetime) -> Status:
    """Return the status that a bottle or lot had at an instant."""
    issued = [one for one in history.certificates if one.issued_at <= at]
    standing = issued[-1] if issued else None
    until = standing.valid_until if standing else None
    if until and history.opened_at and history.opened_until and history.opened_at <= at:
        until = min(until, history.opened_until)
    lot = lot_state(
        valid_until=until,
        notice_days=standing.notice_days if standing else 0,
        held=_held(history.lot_holds, at),
        pulled=history.pulled_at is not None and history.pulled_at <= at,
        now=at,
    )
    used_up = history.used_up_at is not None and history.used_up_at <= at
    return Status(
        state=bottle_state(lot, held=_held(history.own_holds, at), used_up=used_up),
        certificate=standing.number if standing else "",
        reported=standing.reported if standing else "",
        good_until=until,
    )


def changes(history: History, *, since: datetime, until: datetime) -> tuple[Change, ...]:
    """Return what changed after ``since`` up to ``until``, one change an instant, oldest first."""
    before, found = status_at(history, since), []
    reasons = dict(history.reasons)
    for at in sorted({one for one in _instants(history) if since < one <= until}):
        after = status_at(history, at)
        if after != before:
            found.append(Change(at, before, after, reasons.get(at, "")))
            before = after
    return tuple(found)


def _held(doubts: tuple[Doubt, ...], at: datetime) -> bool:
    return any(
        one.held_at <= at and (one.released_at is None or at < one.released_at) for one in doubts
    )


def _instants(history: History) -> Iterator[datetime]:
    """Yield every instant at which the status may change."""
    for one in history.certificates:
        notice = timedelta(days=one.notice_days)
        yield one.issued_at
        yield from (one.valid_until - notice, one.valid_until)
        if history.opened_until:
            yield from (history.opened_until - notice, history.opened_until)
    for doubt in (*history.lot_holds, *history.own_holds):
        yield doubt.held_at
        if doubt.released_at:
            yield doubt.released_at
    for at in (history.pulled_at, history.used_up_at, history.opened_at):
        if at is not None:
            yield at
