"""Labels: which bottles of a lot have one, what was printed, and what is to be printed again."""

from collections.abc import Mapping
from dataclasses import dataclass
from datetime import datetime

from server.lab.label_print import LabelStock, LabelText


@dataclass(frozen=True, slots=True)
class LabelLine:
    """A bottle that may get a label; ``again`` says why it should get a new one."""

    code: str
    url: str
    lot_name: str
    place: str
    state: str
    printed: str
    again: str
    chosen: bool


@dataclass(frozen=True, slots=True)
class PrintLine:
    """A label that was printed: when, by whom, what it said, why again."""

    code: str
    url: str
    at: str
    who: str
    says: str
    reason: str


@dataclass(frozen=True, slots=True)
class LabelsPage:
    """Bottles to print labels for, and what was printed for them so far.

    ``thing`` is the code that was asked for; without one these are the bottles whose label should
    be printed again. ``no_label`` names bottles that get none.
    """

    thing: str
    title: str
    lot_code: str
    bottles: tuple[LabelLine, ...]
    no_label: str
    prints: tuple[PrintLine, ...]
    value_says: str
    hazards_says: str
    base_url: str
    may_print: bool


@dataclass(frozen=True, slots=True)
class LabelJob:
    """One print: its labels in their order, onto what, when and by whom."""

    number: int
    made_at: datetime
    says_at: str
    who: str
    texts: tuple[LabelText, ...]
    onto: LabelStock
    lines: tuple[Mapping[str, str], ...]
    lot_code: str
