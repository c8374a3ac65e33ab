"""Days, instants, numbers and quantities as a person reads them."""

from collections.abc import Mapping
from datetime import date, datetime, timedelta
from decimal import Decimal
from typing import Any

from server.lab.validity import last_day, local_day, read_zone
from server.metrology.rounding import significant

_MONTHS = "Jan Feb Mar Apr May Jun Jul Aug Sep Oct Nov Dec".split()
_UNITS = {"Cel": "°C", "g/cm3": "g/cm³", "1/K": "/K"}


def day_words(day: date) -> str:
    """Return a day like ``1 Dec 2026``."""
    return f"{day.day} {_MONTHS[day.month - 1]} {day.year}"


def typed_day_words(text: str | None) -> str:
    """Return a day kept as year-month-day like ``1 Dec 2026``; other text stays as it is."""
    try:
        return day_words(date.fromisoformat(text or ""))
    except ValueError:
        return text or ""


def iso_day(words: str) -> str:
    """Return a day told by ``day_words`` as year-month-day; other text stays as it is."""
    parts = words.split()
    if len(parts) != 3 or parts[1] not in _MONTHS or not (parts[0] + parts[2]).isdigit():
        return words
    return f"{int(parts[2]):04d}-{_MONTHS.index(parts[1]) + 1:02d}-{int(parts[0]):02d}"


def moment_words(at: datetime, zone: str) -> str:
    """Return an instant in the laboratory's zone like ``1 Dec 2026, 14:05``."""
    local = at.astimezone(read_zone(zone))
    return f"{day_words(local.date())}, {local:%H:%M}"


def signed_words(at: datetime, zone: str) -> str:
    """Return an instant with its zone, as a signature prints it."""
    return f"{moment_words(at, zone)} ({zone})"


def clock_words(at: datetime, zone: str) -> str:
    """Return the hour and minute of an instant in the laboratory's zone."""
    return f"{at.astimezone(read_zone(zone)):%H:%M}"


def last_day_words(until: datetime, zone: str) -> str:
    """Return the last day before an exclusive end."""
    return day_words(last_day(until, zone))


def due_words(until: datetime, now: datetime, zone: str) -> str:
    """Return how far the last good day is: ``in 14 days``, ``today``, ``3 days ago``."""
    days = (last_day(until, zone) - local_day(now, zone)).days
    near = {0: "today", 1: "tomorrow", -1: "yesterday"}
    if days in near:
        return near[days]
    return f"in {days} days" if days > 0 else f"{-days} days ago"


def span_words(span: timedelta) -> str:
    """Return a span of time in its largest whole unit: ``5 minutes``, ``2 hours``, ``3 days``."""
    minutes = max(0, int(span.total_seconds() // 60))
    if minutes < 1:
        return "less than a minute"
    for size, one in ((24 * 60, "day"), (60, "hour"), (1, "minute")):
        if minutes >= size:
            return count_words(minutes // size, one)
    raise AssertionError  # pragma: no cover - a minute is a minute


def count_words(count: int, one: str, many: str | None = None) -> str:
    """Return a count with its noun: ``1 entry``, ``2 entries``."""
    return f"{count} {one if count == 1 else many or one + 's'}"


def listed(words: list[str]) -> str:
    """Return words as one would say them: ``a, b and c``."""
    return words[0] if len(words) == 1 else f"{', '.join(words[:-1])} and {words[-1]}"


def figure_words(value: float | None, digits: int = 6) -> str:
    """Return a computed number with so many significant digits, empty where there is none.

    Certified values are never written by this: they keep the digits that their U gives them.
    """
    return "" if value is None else significant(value, digits)


def plain_words(value: float, digits: int = 7) -> str:
    """Return an input as it entered, to so many digits, without zeros that nobody stated."""
    return f"{Decimal(f'{value:.{digits}g}'):f}"


def unit_words(unit: str | None) -> str:
    """Return a unit as it is printed."""
    return _UNITS.get(unit or "", unit or "")


def quantity_words(quantity: Mapping[str, Any] | None) -> str:
    """Return a stated quantity with its uncertainty, digit by digit as it was typed."""
    if not quantity:
        return ""
    unit = unit_words(quantity.get("unit"))
    value = quantity.get("value")
    parts = [] if value is None else [f"{value} {unit}".strip()]
    parts += _statement(quantity, unit)
    if quantity.get("dof"):
        parts.append(f"{quantity['dof']} degrees of freedom")
    if quantity.get("source"):
        parts.append(str(quantity["source"]))
    return ", ".join(parts)


def _statement(quantity: Mapping[str, Any], unit: str) -> list[str]:
    if quantity.get("U"):
        return [f"U = {quantity['U']} {unit}".strip() + f" (k = {quantity.get('k', '2')})"]
    if quantity.get("u"):
        return [f"u = {quantity['u']} {unit}".strip()]
    if quantity.get("half_width"):
        shape = quantity.get("shape", "rectangular")
        return [f"± {quantity['half_width']} {unit}".strip() + f" ({shape})"]
    return []
