"""What the log of a standard lot says: opened, dried, re-tested, used; and what follows from it."""

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from datetime import date, datetime
from decimal import Decimal
from typing import Any

from server.lab.calibration.check import Check
from server.lab.calibration.drying_log import Drying, DryingDemand, judge_drying, read_demand
from server.lab.calibration.standard_lot import (
    BY_CERTIFICATE,
    Expiry,
    expiry_of,
)
from server.lab.log_lines import standing_lines
from server.lab.sheet_facts import LogFact, StandardLotFact
from server.lab.validity import last_day, read_zone

OPENED, DRYING, USE, RETEST, COUNT = "opened", "drying", "use", "re-test", "count"
_GRAVITY = ("holds", "look", "fails")


@dataclass(frozen=True, slots=True)
class LotExpiry:
    """Until when a standard lot is good, which rule says so, and every rule with its day."""

    at: datetime
    basis: str
    candidates: tuple[tuple[str, date], ...]


def expiry_of_lot(
    document: Mapping[str, Any],
    stated: tuple[datetime, str],
    log: Iterable[LogFact],
    *,
    zone: str,
    as_of: datetime | None = None,
) -> LotExpiry:
    """Return the earliest end of a lot, with the rule that sets it.

    ``stated`` is the certificate's with its basis; the others are the period after opening and
    the next day of the last re-test. The log counts as it stood at ``as_of``.
    """
    lines = tuple(log)
    found: Expiry = expiry_of(
        certificate_expiry=last_day(stated[0], zone),
        opened_on=opened_on(lines, as_of=as_of),
        period_after_opening=str(document.get("period_after_opening") or ""),
        retest_on=_retest_on(document, lines, as_of),
        zone=zone,
    )
    candidates = tuple(
        (stated[1] if rule == BY_CERTIFICATE else rule, day) for rule, day in found.candidates
    )
    if found.until.rule == BY_CERTIFICATE:
        return LotExpiry(stated[0], stated[1], candidates)
    return LotExpiry(found.until.at, found.until.rule, candidates)


def opened_on(log: Iterable[LogFact], *, as_of: datetime | None = None) -> date | None:
    """Return the day on which a lot was opened, None while it is not."""
    days = [str(one.document["day"]) for one in standing_lines(log, OPENED, as_of=as_of)]
    return date.fromisoformat(min(days)) if days else None


def _retest_on(
    document: Mapping[str, Any], log: Iterable[LogFact], as_of: datetime | None
) -> date | None:
    """Return the next re-test day: of the re-test done last, else as it was received."""
    done = standing_lines(log, RETEST, as_of=as_of)
    last = max(done, key=lambda one: (str(one.document["done_on"]), one.at), default=None)
    text = last.document["next_on"] if last else document.get("retest_on")
    return date.fromisoformat(str(text)) if text else None


def drying_of(line: LogFact) -> Drying:
    """Return a drying line of the log as it is judged."""
    document = line.document
    temperature, hours = document.get("temperature"), document.get("hours")
    return Drying(
        temperature_C=Decimal(temperature) if temperature else None,
        hours=Decimal(hours) if hours else None,
        desiccator=bool(document.get("desiccator")),
        ended_at=datetime.fromisoformat(document["ended_at"]),
    )


def done_words(one: Drying) -> str:
    """Return what was done, as one would say it: ``120 °C, 2 h, desiccator``."""
    oven = "no oven" if one.temperature_C is None else f"{one.temperature_C} °C, {one.hours} h"
    return f"{oven}, desiccator" if one.desiccator else oven


def logged_words(line: LogFact, zone: str) -> str:
    """Return a drying line with when it ended, as a sheet's row takes it over."""
    done = drying_of(line)
    ended = done.ended_at.astimezone(read_zone(zone))
    return f"{done_words(done)}, ended {ended:%Y-%m-%d %H:%M}"


def is_drying_step(slot: str) -> bool:
    """Say whether a slot is a step of a recipe in which drying is ticked."""
    return slot.startswith("step:") and ("dried" in slot or "drying" in slot)


def demand_of(document: Mapping[str, Any]) -> DryingDemand | None:
    """Return what a lot's certificate asks for in figures, None where only words say it."""
    demand = document.get("drying_demand")
    return read_demand(demand) if demand else None


def last_drying(
    log: Iterable[LogFact], *, before: datetime, as_of: datetime | None = None
) -> LogFact | None:
    """Return the standing drying that ended last before an instant."""
    ended = [
        one for one in standing_lines(log, DRYING, as_of=as_of) if drying_of(one).ended_at <= before
    ]
    return max(ended, key=lambda one: drying_of(one).ended_at, default=None)


def judge_lot_drying(
    lot: StandardLotFact, *, used_at: Sequence[datetime], as_of: datetime | None = None
) -> Check | None:
    """Return how the log stands to what the certificate asks for, None where it asks no figures.

    Of several instants of use the gravest counts.
    """
    demand = demand_of(lot.document)
    if demand is None:
        return None
    log = [drying_of(one) for one in standing_lines(lot.log, DRYING, as_of=as_of)]
    checks = [judge_drying(demand, log, used_at=at) for at in used_at]
    return max(checks, key=lambda one: _GRAVITY.index(one.verdict), default=None)
