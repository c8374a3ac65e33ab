"""Whether what a sheet rests on was valid when it was used."""

from collections.abc import Iterable
from dataclasses import dataclass
from datetime import datetime

from server.lab.ink import standing
from server.lab.sheet_facts import (
    BALANCE,
    BURETTE,
    ROOM,
    STANDARD_LOT,
    THERMOMETER,
    HoldFact,
    InstrumentFact,
    OverrideFact,
    SheetFacts,
    StandardLotFact,
)
from server.lab.states import HELD, IN_DATE, LAPSED
from server.lab.validity import last_day

_MASSES = frozenset({"container_and_standard", "container_less_standard", "mass", "tare_load"})
_SLOTS = {
    STANDARD_LOT: _MASSES,
    BALANCE: _MASSES,
    BURETTE: frozenset({"burette_start", "burette_end", "blank"}),
    THERMOMETER: frozenset({"temperature"}),
    ROOM: frozenset({"air_temperature", "air_pressure", "air_humidity"}),
}


@dataclass(frozen=True, slots=True)
class InUse:
    """One thing that a sheet rests on, at its last time of use.

    ``state``: in date, lapsed or held; ``says`` is a sentence; ``override`` a keeper's word.
    """

    kind: str
    thing_id: str
    name: str
    used_at: datetime
    due_at: datetime
    state: str
    says: str
    override: OverrideFact | None

    @property
    def blocks(self) -> bool:
        """Whether it may not be used and nobody has let it."""
        return self.state != IN_DATE and self.override is None


def kind_of_slot(slot: str) -> tuple[str, ...]:
    """Return the kinds of things that a slot's reading uses."""
    return tuple(kind for kind, slots in _SLOTS.items() if slot in slots)


def things_in_use(facts: SheetFacts, *, at: datetime | None = None) -> tuple[InUse, ...]:
    """Return all that the sheet rests on, at its last time of use, or at one instant."""
    things: list[StandardLotFact | InstrumentFact] = list(facts.instruments)
    if facts.standard_lot is not None:
        things.insert(0, facts.standard_lot)
    return tuple(_in_use(facts, thing, at) for thing in things)


def _in_use(
    facts: SheetFacts, thing: StandardLotFact | InstrumentFact, at: datetime | None
) -> InUse:
    lot = isinstance(thing, StandardLotFact)
    kind = STANDARD_LOT if isinstance(thing, StandardLotFact) else thing.kind
    used = [
        entry.received_at
        for entry in standing(facts.entries).values()
        if entry.slot in _SLOTS[kind]
    ]
    used_at = at or max(used, default=facts.begun_at)
    state, says = judge(
        thing.name, due_at=thing.due_at, basis=thing.due_basis, holds=thing.holds,
        used_at=used_at, zone=facts.laboratory.zone, what="certificate" if lot else "calibration",
    )  # fmt: skip
    words = [one for one in facts.overrides if one.what == kind]
    return InUse(
        kind=kind,
        thing_id=thing.id if isinstance(thing, StandardLotFact) else thing.instrument_id,
        name=thing.name,
        used_at=used_at,
        due_at=thing.due_at,
        state=state,
        says=says,
        override=words[-1] if words else None,
    )


def judge(
    name: str,
    *,
    due_at: datetime,
    basis: str,
    holds: Iterable[HoldFact],
    used_at: datetime,
    zone: str,
    what: str,
) -> tuple[str, str]:
    """Return the state (in date, lapsed, held) of a thing used at an instant, and a sentence."""
    doubt = [
        one for one in holds if one.released_at is None or one.held_at <= used_at < one.released_at
    ]
    if doubt:
        return HELD, f"{name} is held: {doubt[0].reason}."
    day = last_day(due_at, zone).isoformat()
    if used_at >= due_at:
        return LAPSED, f"The {what} of {name} was good until {day} ({basis}); it has lapsed."
    return IN_DATE, f"{name}: {what} good until {day}."
