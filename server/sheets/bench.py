"""The bench sheet as it is read: rows in the order in which the work is done."""

from dataclasses import dataclass

from server.sheets.curves import CurveView
from server.sheets.plan import PlanView


@dataclass(frozen=True, slots=True)
class EntryView:
    """One entry as written. ``at`` is ISO 8601 in UTC; ``clock`` the local hh:mm for the row.

    ``raw`` is the line that an instrument sent; ``file_url`` the original of a curve.
    ``clock_says`` tells what was wrong with the clock that it was written by, and how late it came.
    """

    id: str
    text: str
    unit: str | None
    raw: str | None
    initials: str
    person: str
    at: str
    clock: str
    late: bool
    reason: str | None
    file_url: str | None = None
    clock_says: str = ""


@dataclass(frozen=True, slots=True)
class StruckEntry:
    """An entry struck through: what it said, and who struck it, when and why."""

    entry: EntryView
    struck_by: str
    struck_clock: str
    struck_at: str
    reason: str


@dataclass(frozen=True, slots=True)
class RemarkView:
    """A countersigner's remark on a row: who sent the sheet back with it, and when."""

    text: str
    by: str
    says_at: str


@dataclass(frozen=True, slots=True)
class BenchRow:
    """One row. ``kind``: number, step, choice, text, curve; ``remarks`` stand oldest first.

    ``low`` and ``high`` are what is possible, ``usual_low`` and ``usual_high`` what is usual.
    """

    replicate: int
    slot: str
    segment: int
    label: str
    unit: str | None
    hint: str
    kind: str
    decimals: int | None
    signed: bool
    required: bool
    choices: tuple[str, ...]
    low: str | None
    high: str | None
    value: EntryView | None
    struck: tuple[StruckEntry, ...]
    usual_low: str | None = None
    usual_high: str | None = None
    remarks: tuple[RemarkView, ...] = ()


@dataclass(frozen=True, slots=True)
class BenchGroup:
    """The rows of one replicate, or of the whole sheet (replicate 0)."""

    replicate: int
    title: str
    excluded: str | None
    rows: tuple[BenchRow, ...]


@dataclass(frozen=True, slots=True)
class MarginReplicate:
    """A running value in the margin: ``value`` is text like ``0.10220``, or None with ``says``."""

    label: str
    value: str | None
    says: str
    excluded: bool


@dataclass(frozen=True, slots=True)
class FindingView:
    """A finding in words. ``reason`` and ``accepted_by`` are there once given."""

    name: str
    verdict: str
    says: str
    figure: str
    limit: str
    basis: str
    reason: str | None
    accepted_by: str | None


@dataclass(frozen=True, slots=True)
class Margin:
    """The slim strip: running values, mean, spread, what is missing, the first finding."""

    replicates: tuple[MarginReplicate, ...]
    unit: str
    mean: str | None
    spread: str | None
    to_go: int
    says: str
    finding: FindingView | None


@dataclass(frozen=True, slots=True)
class RestsOn:
    """Something the sheet rests on, with its state at the time of use.

    ``flag`` says what speaks against it without stopping it: a check that failed. ``stated`` is
    what its certificate or calibration states, line by line.
    """

    kind: str
    name: str
    says: str
    state: str
    override: str | None
    url: str | None
    flag: str = ""
    stated: tuple[tuple[str, str], ...] = ()


@dataclass(frozen=True, slots=True)
class CautionView:
    """A caution about one substance."""

    substance: str
    lines: tuple[str, ...]
    source: str


@dataclass(frozen=True, slots=True)
class SignatureView:
    """A signature as printed: name, time with zone, meaning, and whether it still holds.

    ``trail_seen`` is the act up to which the countersigner had read the sheet's trail.
    """

    printed_name: str
    meaning: str
    at: str
    says_at: str
    digest: str
    holds: bool
    remark: str | None
    trail_seen: int | None = None


@dataclass(frozen=True, slots=True)
class NextRow:
    """Which row is next."""

    replicate: int
    slot: str
    segment: int


@dataclass(frozen=True, slots=True)
class ReturnView:
    """A sheet sent back: by whom, when, with which remark; ``rows`` name rows and their remarks."""

    by: str
    at: str
    says_at: str
    remark: str
    rows: tuple[tuple[str, str], ...]


@dataclass(frozen=True, slots=True)
class BenchSheet:
    """The whole sheet, as the bench page's script gets it."""

    id: str
    number: str
    state: str
    revision: int
    title: str
    against: str
    lot_code: str
    lot_name: str
    recipe: str
    begun: str
    rests_on: tuple[RestsOn, ...]
    cautions: tuple[CautionView, ...]
    deferral: str
    groups: tuple[BenchGroup, ...]
    next: NextRow | None
    margin: Margin
    missing: tuple[str, ...]
    correction_reasons: tuple[str, ...]
    may_write: bool
    may_hand_in: bool
    sent_back_remark: str | None
    signatures: tuple[SignatureView, ...]
    sent_back: ReturnView | None = None
    #: What is no longer as the trail noted it; empty where all is.
    altered: str = ""


@dataclass(frozen=True, slots=True)
class HandInPage:
    """Everything on one page before the signature *measured*; ``problem`` says why it cannot be.

    ``curves`` are the probe's curves with their pictures, where the recipe takes them.
    """

    sheet: BenchSheet
    reported: str | None
    factor: str | None
    findings: tuple[FindingView, ...]
    dots: str
    problem: str | None
    signer: str
    curves: tuple[CurveView, ...] = ()


@dataclass(frozen=True, slots=True)
class SheetLine:
    """A sheet in a list."""

    id: str
    number: str
    title: str
    lot_name: str
    state: str
    says: str
    url: str


@dataclass(frozen=True, slots=True)
class Choice:
    """Something to pick; ``refused`` says why it cannot be picked, ``flag`` what speaks against it.

    What is flagged can be picked all the same.
    """

    id: str
    name: str
    says: str
    refused: str | None
    flag: str = ""


@dataclass(frozen=True, slots=True)
class BenchHome:
    """The bench's start: open sheets and lots to standardize."""

    mine: tuple[SheetLine, ...]
    others: tuple[SheetLine, ...]
    lots: tuple[Choice, ...]
    may_begin: bool


@dataclass(frozen=True, slots=True)
class BeginPage:
    """What the new sheet will rest on, proposed in date, the cautions, and which rows it asks.

    ``plan`` is made with what is proposed; ``plan_url`` leads to the planner with the same.
    """

    lot_code: str
    lot_name: str
    title: str
    recipes: tuple[Choice, ...]
    recipe_id: str
    standard_lots: tuple[Choice, ...]
    balances: tuple[Choice, ...]
    burettes: tuple[Choice, ...]
    thermometers: tuple[Choice, ...]
    rooms: tuple[Choice, ...]
    probes: tuple[Choice, ...]
    mass_window: str
    plan: PlanView
    plan_url: str
    asked: tuple[str, ...]
    cautions: tuple[CautionView, ...]
    deferral: str
    may_override: bool
