"""The trail, filtered and page by page."""

from collections.abc import Mapping
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
#: Rows that a page checks at most, so that it comes at once however long the trail is.
MOST_CHECKED = 20_000
#: What a filter may hold at most, so that a search stays one.
_MOST_TEXT = 200
_MOST_PAGES = 1_000_000


def open_trail(
    session: Session,
    *,
    person: str,
    thing: str,
    day: str,
    actor: Actor | None,
    now: datetime,
    words: str = "",
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
    wanted = trail_filter(person, thing, day, words, zone=reader.zone)
    rows = trail_rows(session, wanted, offset=(page - 1) * LINES, most=LINES + 1)
    checked = check(session, newest=MOST_CHECKED)
    more = len(rows) > LINES
    asked = {"person": person, "thing": thing, "day": day, "words": words}
    return TrailPage(
        lines=trail_lines(rows[:LINES], reader.zone),
        holds=checked.holds,
        badge=checked.says,
        seal=f"Row {checked.seq}: {checked.hash}",
        person=person,
        thing=thing,
        day=day,
        words=words,
        asked=_query(asked),
        people=tuple(trail_people(session)),
        page=page,
        newer_url=_url(asked, page - 1) if page > 1 else None,
        older_url=_url(asked, page + 1) if more else None,
    )


def trail_filter(person: str, thing: str, day: str, words: str, *, zone: str) -> TrailFilter:
    """Return the filter that a person typed.

    Raises:
        Unacceptable: ``day`` is no day.
    """
    start, end = None, None
    if day.strip():
        wanted = read_day(day, "day")
        start = end_of_day(wanted - timedelta(days=1), zone)
        end = end_of_day(wanted, zone)
    return TrailFilter(
        person=person.strip(),
        thing=thing.strip()[:_MOST_TEXT],
        words=words.strip()[:_MOST_TEXT],
        start=start,
        end=end,
    )


def _url(asked: Mapping[str, str], page: int) -> str:
    return f"/trail?{_query({**asked, 'page': str(page)})}"


def _query(asked: Mapping[str, str]) -> str:
    return urlencode({key: value for key, value in asked.items() if value})
