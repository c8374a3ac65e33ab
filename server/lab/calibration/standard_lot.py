"""A standard lot: which rule ends it, and how much of it is left."""

import calendar
import re
from collections.abc import Sequence
from dataclasses import dataclass
from datetime import date, timedelta
from decimal import Decimal

from server.lab.calibration.check import Check
from server.lab.calibration.typed_numbers import read_number
from server.lab.refusal import Unacceptable
from server.lab.validity import ValidUntil, end_of_day

BY_CERTIFICATE = "expiry of the certificate"
BY_OPENING = "period after opening"
BY_RETEST = "re-test day"
_PERIOD = re.compile(r"([1-9][0-9]{0,3}) ?(days?|months?|years?)")
_LONGEST_MONTHS = 600


@dataclass(frozen=True, slots=True)
class Expiry:
    """The end of a standard lot: the day, the rule that set it, and every rule with its day."""

    until: ValidUntil
    day: date
    candidates: tuple[tuple[str, date], ...]


def expiry_of(
    *,
    certificate_expiry: date | None,
    opened_on: date | None = None,
    period_after_opening: str = "",
    retest_on: date | None = None,
    zone: str,
) -> Expiry:
    """Return the earliest end of a standard lot with the rule that set it; the day is its last.

    ``period_after_opening`` reads as ``12 months``, ``90 days`` or ``2 years``; while the lot is
    not opened it does not count.

    Raises:
        Unacceptable: no rule gives a day, or the period cannot be read.
    """
    found: list[tuple[str, date]] = []
    if certificate_expiry is not None:
        found.append((BY_CERTIFICATE, certificate_expiry))
    period = period_after_opening.strip()
    if period:
        _check_period(period)
    if period and opened_on is not None:
        words = f"{BY_OPENING}, {period} from {opened_on.isoformat()}"
        found.append((words, after_period(opened_on, period)))
    if retest_on is not None:
        found.append((BY_RETEST, retest_on))
    if not found:
        says = "Nothing says until when this lot is good: its certificate's expiry, a re-test day, "
        says += "or the day it was opened with a period."
        raise Unacceptable(says, field="certificate_expiry", example="2028-03-31")
    rule, day = min(found, key=lambda one: one[1])
    return Expiry(ValidUntil(end_of_day(day, zone), rule), day, tuple(found))


def after_period(day: date, period: str) -> date:
    """Return the last day of a period that begins on a day; a month's end stays a month's end.

    12 months from 31 August is 31 August, one month from 31 January the last of February.

    Raises:
        Unacceptable: the period cannot be read, or is longer than 50 years.
    """
    count, unit = _check_period(period)
    if unit.startswith("day"):
        return day + timedelta(days=count)
    months = count * (12 if unit.startswith("year") else 1)
    if months > _LONGEST_MONTHS:
        says = "The period after opening is longer than 50 years."
        raise Unacceptable(says, field="period_after_opening", example="12 months")
    index = day.year * 12 + day.month - 1 + months
    year, month = index // 12, index % 12 + 1
    return date(year, month, min(day.day, calendar.monthrange(year, month)[1]))


def _check_period(period: str) -> tuple[int, str]:
    read = _PERIOD.fullmatch(period.strip())
    if not read:
        says = f"period_after_opening “{period[:40]}” is no period: a number with days, months or "
        says += "years."
        raise Unacceptable(says, field="period_after_opening", example="12 months")
    return int(read[1]), read[2]


@dataclass(frozen=True, slots=True)
class Remaining:
    """What is left of a lot in g, what was taken, and the check of it."""

    received_g: Decimal
    taken_g: Decimal
    left_g: Decimal
    check: Check


def remaining_mass(
    received_g: str, taken_g: Sequence[str], *, minimum_sample_g: str | None = None
) -> Remaining:
    """Return what a use log leaves of a lot; every mass is text in g as typed.

    *look* where less than the certificate's smallest sample is left, *fails* where more was taken
    than was received.

    Raises:
        Unacceptable: a mass that is no number or negative.
    """
    received = read_number(received_g, "received", example="100.00", low="0")
    taken = sum(
        (
            read_number(one, f"taken[{i}]", example="0.4123", low="0")
            for i, one in enumerate(taken_g)
        ),
        Decimal(0),
    )
    least = (
        read_number(minimum_sample_g, "minimum_sample_g", example="0.2", low="0")
        if minimum_sample_g
        else Decimal(0)
    )
    left = received - taken
    verdict, says = "holds", f"{left} g of {received} g are left after {len(taken_g)} uses."
    if left < 0:
        verdict = "fails"
        says = f"{taken} g were taken of {received} g: an entry of the use log is wrong."
    elif left < least or left == 0:
        verdict = "look"
        says = f"{left} g are left, less than one sample of {least} g." if left else "Used up."
    check = Check(
        name="remaining mass",
        verdict=verdict,  # type: ignore[arg-type]
        says=says,
        basis="use log of the lot; smallest sample of its certificate",
        figure=float(left),
        limit=float(least),
        unit="g",
        figure_text=f"{left} g",
        limit_text=f"{least} g" if least else "",
    )
    return Remaining(received, taken, left, check)
