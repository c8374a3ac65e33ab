"""The shelf: bottles by code or words, the card of one bottle."""

from dataclasses import dataclass

from server.sheets.bench import CautionView
from server.sheets.uses import UsesView


@dataclass(frozen=True, slots=True)
class BottleLine:
    """A bottle in the table; ``reported`` is empty where the bottle is not in force."""

    code: str
    url: str
    titrant: str
    nominal: str
    lot_name: str
    state: str
    in_force: bool
    reported: str
    place: str
    good_until: str
    due_in: str


@dataclass(frozen=True, slots=True)
class Shelf:
    """The table of bottles, due soonest first; ``nearest`` are codes close to an unknown one.

    ``states``, ``titrants`` and ``places`` are those to filter by; ``only`` is the code of the one
    bottle whose code the words are, empty otherwise.
    """

    words: str
    bottles: tuple[BottleLine, ...]
    says: str
    nearest: tuple[str, ...]
    states: tuple[str, ...]
    state: str
    titrants: tuple[str, ...]
    titrant: str
    places: tuple[str, ...]
    place: str
    only: str


@dataclass(frozen=True, slots=True)
class HistoryLine:
    """An earlier or standing certificate of the lot."""

    number: str
    url: str
    reported: str
    issued: str
    state: str


@dataclass(frozen=True, slots=True)
class AtTemperature:
    """Concentration of the liquid at the temperature of use."""

    celsius: str
    value: str
    uncertainty: str
    cooler: str
    warmer: str
    says: str


@dataclass(frozen=True, slots=True)
class BottleCard:
    """One bottle, readable at arm's length. No names of people in what a visitor gets.

    ``uses`` is None for a visitor; ``opened`` tells when it was opened, empty where it was not.
    """

    code: str
    number: int
    lot_code: str
    lot_name: str
    titrant: str
    nominal: str
    place: str
    state: str
    in_force: bool
    why: str
    value: str
    uncertainty: str
    unit: str
    k: str
    beside: str
    coverage: str
    factor: str
    valid_for: str
    good_until: str
    good_until_rule: str
    due_in: str
    certificate_number: str
    certificate_url: str
    checked: str
    at: AtTemperature | None
    history: tuple[HistoryLine, ...]
    history_chart: str
    cautions: tuple[CautionView, ...]
    deferral: str
    may_hold: bool
    may_release: bool
    may_use_up: bool
    may_open: bool
    may_move: bool
    held_says: str
    label_says: str
    opened: str
    watching: bool
    uses: UsesView | None
