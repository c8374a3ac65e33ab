"""The countersigner's queue, and one sheet in three bands."""

from dataclasses import dataclass

from server.sheets.bench import BenchGroup, FindingView, RestsOn, ReturnView, SignatureView
from server.sheets.curves import CurveView
from server.sheets.methods import ComparisonView


@dataclass(frozen=True, slots=True)
class QueueLine:
    """A sheet that waits, longest first; ``stands_out`` is what to look at.

    ``notes`` tells what its writing holds beside that: corrections, late entries, earlier returns.
    """

    sheet_id: str
    number: str
    title: str
    lot_name: str
    handed_in_by: str
    waiting: str
    reported: str
    stands_out: tuple[FindingView, ...]
    refused: str | None
    url: str
    notes: str


@dataclass(frozen=True, slots=True)
class Queue:
    """All sheets that wait for a second person, and those done last."""

    waiting: tuple[QueueLine, ...]
    done: tuple[QueueLine, ...]


@dataclass(frozen=True, slots=True)
class BudgetRow:
    """One line of the budget as shown; ``share`` is text like ``45 %``."""

    source: str
    value: str
    u: str
    dof: str
    shape: str
    sensitivity: str
    contribution: str
    share: str
    shared: bool
    root: str | None


@dataclass(frozen=True, slots=True)
class ReplicateRow:
    """One replicate as shown."""

    label: str
    value: str
    mass: str
    amount: str
    volume: str
    excluded: str | None


@dataclass(frozen=True, slots=True)
class Figure:
    """A figure of the first band: caption, number, and what it means. ``verdict`` may be empty.

    ``roots`` is what the number comes from, line by line.
    """

    caption: str
    number: str
    says: str
    verdict: str
    roots: tuple[tuple[str, str], ...] = ()


@dataclass(frozen=True, slots=True)
class ToSee:
    """Something to see before signing; ``rows`` are the rows in question, each with its anchor."""

    says: str
    rows: tuple[tuple[str, str], ...] = ()


@dataclass(frozen=True, slots=True)
class TrailLine:
    """A line of the trail."""

    seq: int
    at: str
    says_at: str
    who: str
    act: str
    thing: str
    kind: str
    why: str | None
    details: str


@dataclass(frozen=True, slots=True)
class CountersignPage:
    """One sheet in three bands: the number, why, what was written.

    ``to_see`` is what a signer is shown before she signs, ``trail_last`` the number of the last act
    of the sheet's trail, ``replaces`` the certificate that a new one would replace.
    """

    sheet_id: str
    number: str
    state: str
    revision: int
    title: str
    lot_code: str
    lot_name: str
    handed_in: str
    corrections: int
    value: str
    uncertainty: str
    beside: str
    coverage: str
    unit: str
    k: str
    valid_for: str
    figures: tuple[Figure, ...]
    findings: tuple[FindingView, ...]
    to_accept: tuple[str, ...]
    dots: str
    dots_says: str
    budget: tuple[BudgetRow, ...]
    bars: str
    budget_says: str
    replicates: tuple[ReplicateRow, ...]
    monte_carlo: str
    constants: tuple[tuple[str, str], ...]
    formula: str
    calculation: str
    input_digest: str
    methods: ComparisonView | None
    curves: tuple[CurveView, ...]
    rests_on: tuple[RestsOn, ...]
    groups: tuple[BenchGroup, ...]
    trail: tuple[TrailLine, ...]
    signatures: tuple[SignatureView, ...]
    certificate_url: str | None
    certificate_number: str | None
    refused: str | None
    signer: str
    returns: tuple[ReturnView, ...]
    to_see: tuple[ToSee, ...]
    trail_last: int
    replaces: str | None
    #: What is no longer as the trail noted it; empty where all is.
    altered: str = ""
