"""Clocks of tablets: the server's time rules; one that is too wrong, or late, is told."""

from datetime import UTC, datetime, timedelta

from server.lab.refusal import Unacceptable

#: A device's clock that differs by more is told to whoever countersigns.
MOST_SKEW_S = 120
#: What arrives later than this after it was written is a late entry.
MOST_DELAY = timedelta(minutes=15)
#: The key under which the trail notes how wrong the clock was, in seconds; ahead is positive.
CLOCK_OFF = "device_clock_off_s"


def read_instant(text: str | None, field: str) -> datetime | None:
    """Return a device's time in UTC, None where it told none.

    Raises:
        Unacceptable: it is no ISO 8601 time with its offset.
    """
    if text is None:
        return None
    example = "2026-05-31T10:00:00+02:00"
    try:
        at = datetime.fromisoformat(text)
        if at.tzinfo is None:
            says = f"{field} needs its offset from UTC."
            raise Unacceptable(says, field=field, example=example)
        return at.astimezone(UTC)
    except (ValueError, OverflowError) as problem:
        says = f"{field} must be a time in ISO 8601 with its offset."
        raise Unacceptable(says, field=field, example=example) from problem


def is_late(device_at: datetime | None, received_at: datetime, *, skew_s: int | None) -> bool:
    """Say whether an entry came more than 15 minutes after it was written.

    ``skew_s``: by how many seconds the device's clock is ahead; None where that is not known.
    """
    if device_at is None:
        return False
    return received_at - device_at + timedelta(seconds=skew_s or 0) > MOST_DELAY


def is_ahead(device_at: datetime | None, received_at: datetime) -> bool:
    """Say whether an entry came before its own time: the clock that it was written by is ahead."""
    if device_at is None:
        return False
    return (device_at - received_at).total_seconds() > MOST_SKEW_S
