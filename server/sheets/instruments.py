"""Instruments and their calibrations as they are read."""

from dataclasses import dataclass

from server.sheets.bench import Choice
from server.sheets.standard_lots import FileView, LineView
from server.sheets.stores import Fact


@dataclass(frozen=True, slots=True)
class InstrumentLine:
    """An instrument in a list; ``state``: in date, due soon, lapsed, held, not calibrated.

    ``flag`` says what speaks against it without stopping it.
    """

    id: str
    url: str
    kind: str
    name: str
    says: str
    state: str
    due: str
    due_in: str
    due_basis: str
    certificate: str
    flag: str


@dataclass(frozen=True, slots=True)
class Instruments:
    """The instruments page."""

    instruments: tuple[InstrumentLine, ...]
    may_keep: bool


@dataclass(frozen=True, slots=True)
class IdentityField:
    """One field of the record of an instrument; ``state``: stated, not applicable, missing."""

    label: str
    value: str
    state: str


@dataclass(frozen=True, slots=True)
class ErrorTable:
    """A table of readings and what is added to them, as kept."""

    caption: str
    heads: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]


@dataclass(frozen=True, slots=True)
class CheckView:
    """A check of a calibration with its verdict; ``rule`` names the decision rule, if there is one.

    ``basis`` names the specification.
    """

    name: str
    verdict: str
    says: str
    figure: str
    limit: str
    basis: str
    rule: str


@dataclass(frozen=True, slots=True)
class UsedView:
    """An instrument that a run was done with."""

    kind: str
    name: str
    url: str
    certificate: str


@dataclass(frozen=True, slots=True)
class RunView:
    """A calibration done here: every reading, what it comes to, its budget and its checks.

    ``volumes`` are the V20 of a gravimetric run's rows in mL, with all their digits.
    """

    verdict: str
    facts: tuple[Fact, ...]
    heads: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]
    volumes: tuple[float, ...]
    checks: tuple[CheckView, ...]
    curve: str
    budget_of: str
    budget: tuple[tuple[str, ...], ...]
    used: tuple[UsedView, ...]
    reason: str


@dataclass(frozen=True, slots=True)
class CalibrationView:
    """One calibration, newest first on the instrument's page.

    ``verdict`` is empty where it was not judged here; ``curve`` is a picture.
    """

    version: int
    url: str
    certificate: str
    issuer: str
    done_on: str
    due: str
    due_basis: str
    state: str
    verdict: str
    facts: tuple[Fact, ...]
    table: ErrorTable | None
    checks: tuple[CheckView, ...]
    curve: str
    file: FileView | None
    has_run: bool
    serves: bool


@dataclass(frozen=True, slots=True)
class ChartView:
    """The limits of one check, its chart as a picture, and what the last check says."""

    id: str
    name: str
    says: str
    basis: str
    picture: str
    last_verdict: str
    last_says: str


@dataclass(frozen=True, slots=True)
class InstrumentPage:
    """One instrument: what it is, its state, its calibrations, the checks between them.

    ``check`` and ``limits`` name its check between two calibrations, empty where it has none;
    ``described`` is what a keeper may write anew, as it stands.
    """

    id: str
    kind: str
    name: str
    state: str
    due: str
    due_in: str
    due_basis: str
    held_says: str
    flag: str
    identity: tuple[IdentityField, ...]
    described: dict[str, str]
    facts: tuple[Fact, ...]
    calibrations: tuple[CalibrationView, ...]
    check: str
    limits: str
    charts: tuple[ChartView, ...]
    lines: tuple[LineView, ...]
    holds: tuple[str, ...]
    buffers: tuple[tuple[str, tuple[str, ...]], ...]
    runs_here: bool
    has_class: bool
    may_keep: bool
    may_log: bool
    may_hold: bool
    may_release: bool


@dataclass(frozen=True, slots=True)
class CalibrationPage:
    """One calibration of an instrument, with the run that it came from."""

    id: str
    kind: str
    name: str
    calibration: CalibrationView
    run: RunView | None


@dataclass(frozen=True, slots=True)
class RunForm:
    """The form of a calibration done here: what is known of the instrument, what can be picked.

    ``wares`` are what it can be weighed as; ``points`` the readings of a burette that are weighed
    first, row by row; ``today`` is the laboratory's day.
    """

    id: str
    kind: str
    name: str
    capacity: str
    resolution: str
    wares: tuple[str, ...]
    points: tuple[str, ...]
    rules: tuple[tuple[str, str], ...]
    buffers: tuple[tuple[str, tuple[str, ...]], ...]
    balances: tuple[Choice, ...]
    thermometers: tuple[Choice, ...]
    rooms: tuple[Choice, ...]
    today: str
    next_version: int


@dataclass(frozen=True, slots=True)
class RunPreview:
    """What a run comes to so far.

    ``volumes`` are (place, V20 in mL as printed) of the weighings that are whole; ``run`` is None
    until there is an outcome, and ``says`` tells why.
    """

    volumes: dict[int, str]
    unfinished: tuple[int, ...]
    run: RunView | None
    says: str
    field: str | None
