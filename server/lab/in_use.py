"""Whether what a sheet rests on was valid when it was used."""

from collections.abc import Iterable
from dataclasses import dataclass
from datetime import datetime

from server.lab.calibration.check_log import check_that_counts
from server.lab.curve_entry import SLOT as CURVE
from server.lab.ink import standing
from server.lab.sheet_facts import (
    BALANCE,
    BURETTE,
    FLASK,
    PIPETTE,
    PROBE,
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
from server.lab.validity import last_day, local_day

MASS_SLOTS = frozenset({"container_and_standard", "container_less_standard", "mass", "tare_load"})
_SLOTS = {
    STANDARD_LOT: MASS_SLOTS,
    BALANCE: MASS_SLOTS,
    BURETTE: frozenset({"burette_start", "burette_end", "blank", CURVE}),
    PIPETTE: frozenset(),
    FLASK: frozenset(),
    PROBE: frozenset({"burette_end", "blank", CURVE}),
    THERMOMETER: frozenset({"temperature"}),
    ROOM: frozenset({"air_temperature", "air_pressure", "air_humidity"}),
}


@dataclass(frozen=True, slots=True)
class InUse:
    """One thing that a sheet rests on, at its last time of use.

    ``state``: in date, lapsed or held; ``says`` is a sentence; ``override`` a keeper's word.
    ``flag`` says what speaks against it without stopping what is under way; ``off_limits`` is the
    sentence about a last check that failed, for which no sheet is begun with it.
    """

    kind: str
    thing_id: str
    name: str
    used_at: datetime
    due_at: datetime
    state: str
    says: str
    override: OverrideFact | None
    flag: str = ""
    off_limits: str = ""

    @property
    def blocks(self) -> bool:
        """Whether it may not be used and nobody has let it."""
        return self.state != IN_DATE and self.override is None


def is_mass(slot: str) -> bool:
    """Say whether a slot holds a weighing of the standard or of what it stands in."""
    return slot in MASS_SLOTS


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
    zone, as_of = facts.laboratory.zone, facts.log_as_of
    instrument = None if isinstance(thing, StandardLotFact) else thing
    return InUse(
        kind=kind,
        thing_id=thing.id if isinstance(thing, StandardLotFact) else thing.instrument_id,
        name=thing.name,
        used_at=used_at,
        due_at=thing.due_at,
        state=state,
        says=says,
        override=words[-1] if words else None,
        flag=flag_of(instrument, at=used_at, zone=zone, as_of=as_of) if instrument else "",
        off_limits=off_limits(instrument, at=used_at, zone=zone, as_of=as_of) if instrument else "",
    )


def off_limits(
    instrument: InstrumentFact, *, at: datetime, zone: str, as_of: datetime | None = None
) -> str:
    """Return why no sheet is begun with an instrument: its last check failed; empty if not."""
    last = check_that_counts(instrument, at=at, zone=zone, as_of=as_of)
    if last is None or last.outcome.verdict != "fails":
        return ""
    day = local_day(last.line.at, zone).isoformat()
    return (
        f"The last {last.line.what} of {instrument.name}, {day}, failed. {last.outcome.says} "
        f"Limits: {last.outcome.limit_text}."
    )


def flag_of(
    instrument: InstrumentFact, *, at: datetime, zone: str, as_of: datetime | None = None
) -> str:
    """Return what speaks against an instrument at an instant, empty where nothing does."""
    last = check_that_counts(instrument, at=at, zone=zone, as_of=as_of)
    says = [f"Its calibration: {one}" for one in instrument.failing]
    if last is not None and last.outcome.verdict != "holds":
        says.append(f"Last {last.line.what}: {last.outcome.says}")
    return " ".join(says)


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
