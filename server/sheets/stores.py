"""Standard lots, recipes and instruments as they are read."""

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class StoreLine:
    """A standard lot or instrument in a list; ``state``: in date, due soon, lapsed, held."""

    id: str
    url: str
    kind: str
    name: str
    says: str
    state: str
    due: str
    certificate: str


@dataclass(frozen=True, slots=True)
class RecipeLine:
    """A recipe's newest version in a list."""

    id: str
    url: str
    name: str
    version: int
    titrant: str
    against: str
    says: str


@dataclass(frozen=True, slots=True)
class Stores:
    """The stores page."""

    standard_lots: tuple[StoreLine, ...]
    recipes: tuple[RecipeLine, ...]
    may_keep: bool


@dataclass(frozen=True, slots=True)
class Instruments:
    """The instruments page."""

    instruments: tuple[StoreLine, ...]
    may_keep: bool


@dataclass(frozen=True, slots=True)
class Fact:
    """A labelled value."""

    label: str
    value: str


@dataclass(frozen=True, slots=True)
class ErrorTable:
    """A table of indications and errors as typed."""

    caption: str
    heads: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]


@dataclass(frozen=True, slots=True)
class CalibrationView:
    """One calibration, newest first on the instrument's page."""

    version: int
    certificate: str
    issuer: str
    done_on: str
    due: str
    due_basis: str
    state: str
    facts: tuple[Fact, ...]
    table: ErrorTable | None
    serves: bool


@dataclass(frozen=True, slots=True)
class InstrumentPage:
    """One instrument with its calibrations."""

    id: str
    kind: str
    name: str
    state: str
    held_says: str
    facts: tuple[Fact, ...]
    calibrations: tuple[CalibrationView, ...]
    may_keep: bool
    may_hold: bool
    may_release: bool


@dataclass(frozen=True, slots=True)
class StandardLotPage:
    """One standard lot: what its certificate states, and where it was used."""

    id: str
    name: str
    substance: str
    state: str
    held_says: str
    facts: tuple[Fact, ...]
    sheets: tuple[tuple[str, str], ...]
    may_keep: bool
    may_hold: bool
    may_release: bool


@dataclass(frozen=True, slots=True)
class RecipePage:
    """One version of a recipe."""

    id: str
    name: str
    version: int
    facts: tuple[Fact, ...]
    steps: tuple[str, ...]
    limits: tuple[tuple[str, str, str], ...]
    versions: tuple[tuple[int, str], ...]
    may_keep: bool
