"""Until when a certificate is valid, and which rule says so."""

from dataclasses import dataclass
from datetime import UTC, date, datetime, time, timedelta
from zoneinfo import ZoneInfo, ZoneInfoNotFoundError

from server.lab.refusal import Unacceptable

_FIRST_YEAR, _LAST_YEAR = 1900, 2999


@dataclass(frozen=True, slots=True)
class ValidUntil:
    """The first instant at which it is no longer valid, and the rule that set it, in words."""

    at: datetime
    rule: str


def read_zone(name: str) -> ZoneInfo:
    """Return the time zone of an IANA name."""
    try:
        return ZoneInfo(name)
    except (ZoneInfoNotFoundError, ValueError, OSError) as problem:
        says = f"“{name}” is no time zone that is known here."
        raise Unacceptable(says, field="zone", example="Europe/Berlin") from problem


def read_day(text: str, field: str) -> date:
    """Return the day that a person typed as year-month-day."""
    try:
        day = date.fromisoformat(text.strip())
    except ValueError as problem:
        says = f"{field} must be a day, written year-month-day."
        raise Unacceptable(says, field=field, example="2026-05-31") from problem
    if not _FIRST_YEAR <= day.year <= _LAST_YEAR:
        says = f"{field} must be a day from {_FIRST_YEAR} to {_LAST_YEAR}."
        raise Unacceptable(says, field=field, example="2026-05-31")
    return day


def local_day(at: datetime, zone: str) -> date:
    """Return the calendar day of an instant in the laboratory's zone."""
    return at.astimezone(read_zone(zone)).date()


def end_of_day(day: date, zone: str) -> datetime:
    """Return the exclusive instant at which a local day ends, in UTC."""
    midnight = datetime.combine(day + timedelta(days=1), time(), tzinfo=read_zone(zone))
    return midnight.astimezone(UTC)


def last_day(until: datetime, zone: str) -> date:
    """Return the last local day on which something is valid: the day before ``until``."""
    return local_day(until - timedelta(microseconds=1), zone)


def valid_until(
    *, measured_at: datetime, interval_days: int, use_by: date | None, zone: str
) -> ValidUntil:
    """Return the earlier of the recipe's interval and the lot's own use-by day."""
    by_recipe = local_day(measured_at, zone) + timedelta(days=interval_days)
    if use_by is not None and use_by < by_recipe:
        return ValidUntil(end_of_day(use_by, zone), "use-by day of the lot")
    days = "1 day" if interval_days == 1 else f"{interval_days} days"
    return ValidUntil(
        end_of_day(by_recipe, zone), f"interval of the recipe, {days} after measuring"
    )
