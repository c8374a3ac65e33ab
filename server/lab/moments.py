"""Instants that a person or program writes."""

from datetime import UTC, datetime, timedelta

from server.lab.refusal import Unacceptable
from server.lab.validity import read_zone

#: By so much the clock of an instrument may run ahead of this one.
AHEAD = timedelta(minutes=5)
_EXAMPLE = "2026-05-31T14:05"


def read_moment(text: str, field: str, *, zone: str, now: datetime) -> datetime:
    """Return a past instant in UTC: a local time of the laboratory, or one with its offset.

    Raises:
        Unacceptable: it is no time, lies in the future, or before 1900.
    """
    try:
        at = datetime.fromisoformat(text.strip())
        at = at.replace(tzinfo=read_zone(zone)) if at.tzinfo is None else at
        at = at.astimezone(UTC)
    except (ValueError, OverflowError) as problem:
        says = f"{field} must be a time, written year-month-dayThour:minute."
        raise Unacceptable(says, field=field, example=_EXAMPLE) from problem
    if at > now + AHEAD:
        raise Unacceptable(f"{field} lies in the future.", field=field, example=_EXAMPLE)
    if at.year < 1900:
        raise Unacceptable(f"{field} lies too far back.", field=field, example=_EXAMPLE)
    return min(at, now)
