"""One standard lot as it is read, with its life."""

from dataclasses import dataclass

from server.sheets.stores import Fact


@dataclass(frozen=True, slots=True)
class RuleView:
    """A rule with the last day that it gives; ``sets`` where it is the earliest."""

    rule: str
    day: str
    sets: bool


@dataclass(frozen=True, slots=True)
class FileView:
    """An original that can be fetched."""

    name: str
    url: str
    size: str
    sha256: str
    kept: str


@dataclass(frozen=True, slots=True)
class LineView:
    """A line of the log; ``struck`` says who struck it through, when and why."""

    id: str
    what: str
    day: str
    says: str
    by: str
    struck: str
    may_strike: bool


@dataclass(frozen=True, slots=True)
class UseView:
    """A use with what it left; ``counted`` where nothing was taken but what is there was weighed.

    ``url`` leads to the sheet it comes from; ``line_id`` is there for one written by hand.
    """

    day: str
    what: str
    name: str
    url: str | None
    taken: str
    left: str
    below: bool
    by: str
    counted: bool
    line_id: str | None
    struck: str
    may_strike: bool


@dataclass(frozen=True, slots=True)
class CheckView:
    """What a check says: verdict, sentence, basis."""

    verdict: str
    says: str
    basis: str


@dataclass(frozen=True, slots=True)
class UsedOn:
    """A bench sheet that weighs the lot, with the certificate that was issued from it."""

    number: str
    url: str
    begun: str
    state: str
    certificate: str
    certificate_url: str


@dataclass(frozen=True, slots=True)
class StandardLotPage:
    """One standard lot: its certificate, its end, its logs, what rests on it.

    ``drying_now`` is what the finding would say of a weighing at this instant.
    """

    id: str
    name: str
    substance: str
    state: str
    held_says: str
    due: str
    due_in: str
    due_rule: str
    rules: tuple[RuleView, ...]
    facts: tuple[Fact, ...]
    file: FileView | None
    opened: str
    log: tuple[LineView, ...]
    drying_asked: str
    dryings: tuple[LineView, ...]
    drying_now: CheckView | None
    left: str
    left_check: CheckView | None
    uses: tuple[UseView, ...]
    sheets: tuple[UsedOn, ...]
    holds: tuple[str, ...]
    now_local: str
    today: str
    may_keep: bool
    may_log: bool
    may_hold: bool
    may_release: bool
