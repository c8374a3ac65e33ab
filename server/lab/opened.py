"""How long a bottle is good once it is open, beside what its certificate says."""

from datetime import datetime, timedelta

from server.lab.refusal import Unacceptable
from server.lab.validity import ValidUntil, end_of_day, local_day

MOST_DAYS = 3650
_EXAMPLE = "30"


def read_opened_days(text: str, field: str = "opened_days") -> int | None:
    """Return for how many days an opened bottle is good, None where the lot states nothing.

    Raises:
        Unacceptable: it is no whole number of days from 1 to 3650.
    """
    typed = text.strip()
    if not typed:
        return None
    if not (typed.isascii() and typed.isdigit() and len(typed) < 6 and int(typed) >= 1):
        says = f"{field} must be a whole number of days."
        raise Unacceptable(says, field=field, example=_EXAMPLE)
    if int(typed) > MOST_DAYS:
        raise Unacceptable(f"{field}: {MOST_DAYS} days is the most.", field=field, example=_EXAMPLE)
    return int(typed)


def opened_end(opened_at: datetime, days: int, zone: str) -> datetime:
    """Return the exclusive instant at which an opened bottle is no longer good, in UTC.

    The day of opening counts as day 0: opened on 1 May and good for 30 days, it is good on 31 May.
    """
    return end_of_day(local_day(opened_at, zone) + timedelta(days=days), zone)


def bottle_until(certified: ValidUntil, opened_until: datetime | None) -> ValidUntil:
    """Return the earlier of the certificate's end and the opened bottle's, with its rule."""
    if opened_until is None or certified.at <= opened_until:
        return certified
    return ValidUntil(opened_until, "the bottle is open: the lot limits how long it keeps")
