"""The trail, filtered and page by page."""

from datetime import datetime, timedelta
from urllib.parse import urlencode

from sqlalchemy.orm import Session

from server.lab.actor import Actor
from server.lab.validity import end_of_day, read_day
from server.records.queries.list_trail import TrailFilter, trail_people, trail_rows
from server.records.trail import check
from server.sheets.parts.acts import trail_lines
from server.sheets.parts.doors import need_reader
from server.sheets.trail import TrailPage

LINES = 50
_MOST_PAGES = 1_000_000


def open_trail(
    session: Session,
    *,
    person: str,
    thing: str,
    day: str,
    actor: Actor | None,
    now: datetime,
    page: int = 1,
) -> TrailPage:
    """Return a page of the trail, the newest first, and whether its chain holds.

    Raises:
        NotSignedIn: a visitor.
        Unacceptable: ``day`` is no day.
    """
    del now
    reader = need_reader(actor)
    page = min(max(page, 1), _MOST_PAGES)
    wanted = trail_filter(person, thing, day, reader.zone)
    rows = trail_rows(session, wanted, offset=(page - 1) * LINES, most=LINES + 1)
    checked = check(session)
    more = len(rows) > LINES
    return TrailPage(
        lines=trail_lines(rows[:LINES], reader.zone),
        holds=checked.holds,
        badge=checked.says,
        person=person,
        thing=thing,
        day=day,
        people=tuple(trail_people(session)),
        page=page,
        newer_url=_url(person, thing, day, page - 1) if page > 1 else None,
        older_url=_url(person, thing, day, page + 1) if more else None,
    )


def trail_filter(person: str, thing: str, day: str, zone: str) -> TrailFilter:
    """Return the filter that a person typed.

    Raises:
        Unacceptable: ``day`` is no day.
    """
    start, end = None, None
    if day.strip():
        wanted = read_day(day, "day")
        start = end_of_day(wanted - timedelta(days=1), zone)
        end = end_of_day(wanted, zone)
    return TrailFilter(person=person.strip(), thing=thing.strip()[:200], start=start, end=end)


def _url(person: str, thing: str, day: str, page: int) -> str:
    asked = {"person": person, "thing": thing, "day": day, "page": str(page)}
    return f"/trail?{urlencode({key: value for key, value in asked.items() if value})}"
