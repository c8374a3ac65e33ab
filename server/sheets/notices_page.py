"""Notices of watched bottles and lots, computed from stored facts and the present instant."""

from collections.abc import Sequence
from datetime import datetime

from sqlalchemy.orm import Session

from server.lab.actor import Actor
from server.lab.watching import Change, changes, status_at
from server.records.queries.list_letters import unsent_problem
from server.records.queries.list_watches import Watched, mailbox_of, watched, watches_of
from server.sheets.notices import Notice, NoticesPage, WatchLine
from server.sheets.parts.changes import change_words
from server.sheets.parts.doors import need_reader
from server.sheets.parts.sheet_lines import lot_words
from server.sheets.parts.telling import moment_words

MOST = 200


def open_notices(
    session: Session, *, actor: Actor | None, now: datetime, sends_mail: bool = False
) -> NoticesPage:
    """Return what was told to who is here, newest first, and what she watches.

    Raises:
        NotSignedIn: a visitor.
    """
    reader = need_reader(actor)
    found = watched(session, watches_of(session, reader.person_id))
    box = mailbox_of(session, reader.person_id)
    read_until = box.read_until if box else None
    told = _told(found, now)
    unread = sum(1 for _, change in told if read_until is None or change.at > read_until)
    standing = [one for one in found if one.watch.ended_at is None]
    return NoticesPage(
        notices=tuple(
            _notice(one, change, reader.zone, read_until=read_until) for one, change in told[:MOST]
        ),
        unread=unread,
        read_until=told[0][1].at.isoformat() if told else "",
        watches=tuple(_watch_line(one, reader.zone, now) for one in standing),
        address=box.address if box else "",
        sends_mail=sends_mail,
        mail_problem=unsent_problem(session, reader.person_id) if sends_mail else "",
    )


def count_unread(session: Session, person_id: str, *, now: datetime) -> int:
    """Return how many notices a person has not read; one select where she watches nothing."""
    watches = watches_of(session, person_id)
    if not watches:
        return 0
    box = mailbox_of(session, person_id)
    since = box.read_until if box else None
    found = watched(session, watches, since=since)
    return sum(len(_changes(one, now, since)) for one in found)


def title_of(one: Watched) -> str:
    """Return a watched thing's name: titrant, nominal, and the code of its bottle or its name."""
    if one.bottle is not None:
        return f"{lot_words(one.lot)}, bottle {one.bottle.code}"
    return f"{lot_words(one.lot)}, lot {one.lot.name}"


def path_of(one: Watched) -> str:
    """Return the address of a watched thing's page."""
    return f"/b/{one.bottle.code}" if one.bottle is not None else f"/lots/{one.lot.code}"


def _told(found: Sequence[Watched], now: datetime) -> list[tuple[Watched, Change]]:
    told = [(one, change) for one in found for change in _changes(one, now, None)]
    return sorted(told, key=lambda pair: (pair[1].at, pair[0].watch.id), reverse=True)


def _changes(one: Watched, now: datetime, since: datetime | None) -> tuple[Change, ...]:
    began, ended = one.watch.began_at, one.watch.ended_at
    until = min(now, ended) if ended else now
    return changes(one.history, since=max(began, since) if since else began, until=until)


def _notice(one: Watched, change: Change, zone: str, *, read_until: datetime | None) -> Notice:
    return Notice(
        at=change.at.isoformat(),
        when=moment_words(change.at, zone),
        title=title_of(one),
        url=path_of(one),
        says=change_words(change, zone),
        state=change.after.state,
        unread=read_until is None or change.at > read_until,
    )


def _watch_line(one: Watched, zone: str, now: datetime) -> WatchLine:
    return WatchLine(
        kind=one.watch.kind,
        code=one.bottle.code if one.bottle is not None else one.lot.code,
        url=path_of(one),
        title=title_of(one),
        state=status_at(one.history, now).state,
        since=moment_words(one.watch.began_at, zone),
    )
