"""A titrant lot as it is read."""

from dataclasses import dataclass

from server.sheets.bench import CautionView, SheetLine
from server.sheets.shelf import BottleLine, HistoryLine
from server.sheets.stores import Fact
from server.sheets.uses import UsesView


@dataclass(frozen=True, slots=True)
class LotPage:
    """One lot: preparation, bottles, sheets, certificates, and who used it.

    ``use_days`` are days from which to list the uses: each with the words that say why.
    """

    id: str
    code: str
    name: str
    title: str
    state: str
    why: str
    facts: tuple[Fact, ...]
    bottles: tuple[BottleLine, ...]
    sheets: tuple[SheetLine, ...]
    certificates: tuple[HistoryLine, ...]
    history_chart: str
    may_bottle: bool
    may_hold: bool
    may_release: bool
    may_standardize: bool
    may_propose_pull: bool
    may_confirm_pull: bool
    pull_says: str
    watching: bool
    uses: UsesView
    use_days: tuple[tuple[str, str], ...]


@dataclass(frozen=True, slots=True)
class MakeUpPage:
    """What the form for a new lot offers."""

    titrants: tuple[tuple[str, str], ...]
    proposed_name: str
    cautions: tuple[CautionView, ...]
    deferral: str
