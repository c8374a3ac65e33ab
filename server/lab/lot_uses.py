"""How much of a standard lot was taken, and what is left of it after each use."""

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from datetime import datetime
from decimal import Decimal
from typing import Any

from server.lab.calibration.standard_lot import Remaining, remaining_mass
from server.lab.log_lines import standing_lines
from server.lab.lot_log import COUNT, USE
from server.lab.sheet_facts import LogFact, StandardLotFact
from server.metrology.decimal_text import DecimalProblem, read_typed_decimal


@dataclass(frozen=True, slots=True)
class Taken:
    """What was taken at one time in g: ``what`` in words, by whom, from which sheet or line.

    ``counted`` is set where nothing was taken, but what is there was weighed.
    """

    at: datetime
    mass_g: Decimal
    what: str
    by: str
    sheet_id: str | None = None
    line_id: str | None = None
    counted: bool = False


@dataclass(frozen=True, slots=True)
class Use:
    """A use with what is left after it in g, None where nobody wrote how much came."""

    taken: Taken
    left_g: Decimal | None


def is_counted(lot: StandardLotFact) -> bool:
    """Say whether anybody wrote how much of a lot there was: what is left can be told."""
    return bool(lot.document.get("received_g") or standing_lines(lot.log, COUNT))


def weighed_masses(readings: Iterable[tuple[int, str, str]]) -> tuple[Decimal, ...]:
    """Return the mass in g of each weighing that is whole; readings: replicate, slot, text.

    A replicate that was left out of the mean was weighed all the same.
    """
    found: dict[int, dict[str, Decimal]] = {}
    for replicate, slot, text in readings:
        try:
            found.setdefault(replicate, {})[slot] = read_typed_decimal(text, slot)
        except DecimalProblem:
            continue
    masses = (_mass(one) for _, one in sorted(found.items()))
    return tuple(one for one in masses if one is not None and one > 0)


def taken_by_hand(log: Iterable[LogFact]) -> tuple[Taken, ...]:
    """Return the uses and counts that somebody wrote in the log by hand."""
    lines = tuple(log)
    return tuple(
        Taken(
            at=one.at,
            mass_g=Decimal(one.document["mass_g"]),
            what=str(one.document.get("says") or ""),
            by=one.by.printed_name,
            line_id=one.id,
            counted=kind == COUNT,
        )
        for kind in (USE, COUNT)
        for one in standing_lines(lines, kind)
    )


def running_uses(document: Mapping[str, Any], taken: Iterable[Taken]) -> tuple[Use, ...]:
    """Return the uses in the order of time, each with what it left; a count begins anew."""
    left = Decimal(document["received_g"]) if document.get("received_g") else None
    found = []
    for one in sorted(taken, key=lambda use: (use.at, use.line_id or "")):
        if one.counted:
            left = one.mass_g
        elif left is not None:
            left -= one.mass_g
        found.append(Use(one, left))
    return tuple(found)


def remaining_of(document: Mapping[str, Any], uses: Sequence[Use]) -> Remaining | None:
    """Return what is left of a lot with its check, None where nobody wrote how much there was.

    It begins with the last count, or with what was received.
    """
    counts = [place for place, one in enumerate(uses) if one.taken.counted]
    start = uses[counts[-1]].taken.mass_g if counts else document.get("received_g")
    if start is None or start == "":
        return None
    since = uses[counts[-1] + 1 :] if counts else uses
    return remaining_mass(
        str(start),
        [str(one.taken.mass_g) for one in since],
        minimum_sample_g=document.get("minimum_sample_g"),
    )


def _mass(read: Mapping[str, Decimal]) -> Decimal | None:
    if "mass" in read:
        return read["mass"]
    if {"container_and_standard", "container_less_standard"} <= set(read):
        return read["container_and_standard"] - read["container_less_standard"]
    return None
