"""The state of a lot or bottle, in a word and in words, and the number that it may show."""

from collections.abc import Mapping
from datetime import datetime
from typing import Any

from server.lab.states import (
    CHECK_DUE,
    HELD,
    IN_FORCE,
    LAPSED,
    PULLED,
    UNPROVEN,
    USED_UP,
    may_be_used,
)
from server.records.queries.list_holds import StandingHold
from server.records.queries.list_shelf import BottleOnShelf, LotOnShelf
from server.sheets.parts.telling import due_words, last_day_words, moment_words
from server.sheets.shelf import BottleLine


def state_of_lot(lot: LotOnShelf, now: datetime) -> str:
    """Return a lot's state at an instant."""
    return lot.state(now)


def is_altered(lot: LotOnShelf) -> bool:
    """Say whether a lot's standing certificate is not the text that was issued."""
    return lot.is_altered


def state_of_bottle(one: BottleOnShelf, now: datetime) -> str:
    """Return the graver of a bottle's own state and its lot's."""
    return one.state(now)


def concentration_in_force(lot: LotOnShelf, state: str) -> Mapping[str, Any] | None:
    """Return the bench result of the standing certificate, or None where nothing is in force."""
    if lot.certificate is None or not may_be_used(state):
        return None
    result: Mapping[str, Any] = lot.certificate.document["result"]
    return result


def bottle_line(one: BottleOnShelf, now: datetime, zone: str) -> BottleLine:
    """Return a bottle for a table; a number only where the bottle is in force."""
    state, lot = state_of_bottle(one, now), one.lot
    result = concentration_in_force(lot, state)
    good = one.good_until if state in {IN_FORCE, CHECK_DUE, LAPSED} else None
    until = good.at if good else None
    return BottleLine(
        code=one.bottle.code,
        url=f"/b/{one.bottle.code}",
        titrant=lot.lot.titrant,
        nominal=nominal_words(lot.lot.nominal),
        lot_name=lot.lot.name,
        state=state,
        in_force=result is not None,
        reported=result["concentration"]["reported"] if result else "",
        place=one.bottle.place,
        good_until=last_day_words(until, zone) if until else "",
        due_in=due_words(until, now, zone) if until else "",
    )


def nominal_words(nominal: str) -> str:
    """Return a nominal concentration with its unit."""
    return f"{nominal} mol/L"


def why_of_bottle(one: BottleOnShelf, state: str, zone: str) -> str:
    """Return in a sentence what the state means for a bottle; no names."""
    until = one.good_until
    if until is not None and until != one.lot.good_until and state in {LAPSED, CHECK_DUE}:
        day = last_day_words(until.at, zone)
        if state == LAPSED:
            return f"It was opened, and open it was good until {day}. Take another bottle."
        return f"Still in force, but it is open, and open it is good until {day} only."
    return why(one.lot, state, zone, thing="bottle")


def why(lot: LotOnShelf, state: str, zone: str, *, thing: str) -> str:
    """Return in a sentence what the state means for a ``thing`` (bottle or lot); no names."""
    if state == HELD and is_altered(lot):
        return (
            "Its certificate does not match what was issued: out of use until the steward has "
            "looked into it."
        )
    day, number = "", ""
    if lot.certificate is not None:
        day = last_day_words(lot.certificate.row.valid_until, zone)
        number = lot.certificate.row.number
    return {
        IN_FORCE: f"Certificate {number} stands and is good until {day}.",
        CHECK_DUE: f"Still in force, but to be standardized again soon: good until {day}.",
        LAPSED: f"Its certificate {number} was good until {day}. It must be standardized again.",
        UNPROVEN: "It was made up, but no certificate carries its concentration yet.",
        HELD: f"Somebody doubts this {thing}. It is out of use until somebody else releases it.",
        PULLED: "This lot was taken out of use for good.",
        USED_UP: "This bottle is used up.",
    }[state]


def held_says(hold: StandingHold | None, thing: str, zone: str) -> str:
    """Return who holds a thing since when and why, for people of the laboratory."""
    if hold is None:
        return ""
    at = moment_words(hold.held_at, zone)
    end = "" if hold.reason.endswith((".", "!", "?")) else "."
    return f"{hold.printed_name} holds this {thing} since {at}: {hold.reason}{end}"
