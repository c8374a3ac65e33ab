"""End-point methods of a lot compared: what the page, the countersigner and the API are told."""

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class MethodRow:
    """One method in figures; ``mark`` is its shape in the picture, ``trueness`` may be empty.

    ``own_u`` is what its replicates share of u: the method's own part, and with a reference all
    that the reference does not share.
    """

    method: str
    mark: str
    shape: str
    taken: bool
    n: int
    mean: str
    s: str
    relative_s: str
    low: str
    high: str
    own_u: str
    trueness: str
    En: str


@dataclass(frozen=True, slots=True)
class PairRow:
    """Two methods set against each other; differences in percent as text, ``how`` in a word."""

    first: str
    second: str
    how: str
    difference: str
    low: str
    high: str
    p: str
    p_equal: str
    p_spread: str
    verdict: str
    says: str


@dataclass(frozen=True, slots=True)
class TestRow:
    """A test over several methods: its name, what it asks, statistic, degrees of freedom, p."""

    __test__ = False

    name: str
    asks: str
    statistic: str
    dof: str
    p: str


@dataclass(frozen=True, slots=True)
class ComparisonView:
    """Methods compared as shown. ``problem`` says why there is no comparison, else it is empty.

    ``against_taken`` sets the method that the number rests on against each other one; ``proposal``
    proposes and never chooses; ``left_out`` names the methods that are not compared.
    """

    problem: str
    precision: str
    trueness: str
    matters: str
    matters_verdict: str
    against_taken: str
    proposal: str
    chart: str
    unit: str
    margin: str
    margin_basis: str
    reference: str
    rows: tuple[MethodRow, ...]
    pairs: tuple[PairRow, ...]
    tests: tuple[TestRow, ...]
    left_out: tuple[str, ...]
    notes: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class SheetChoice:
    """A sheet of the lot: whether it is compared, or in words why it cannot be."""

    number: str
    says: str
    url: str
    chosen: bool
    refused: str


@dataclass(frozen=True, slots=True)
class MethodsPage:
    """End-point methods of one lot over its sheets."""

    code: str
    name: str
    title: str
    sheets: tuple[SheetChoice, ...]
    reference: str
    reference_U: str
    comparison: ComparisonView
