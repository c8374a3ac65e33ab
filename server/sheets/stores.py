"""Standard lots in lists, and recipes, as they are read."""

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class StandardLotLine:
    """A standard lot in the list; ``left`` is empty where nobody wrote how much came."""

    id: str
    url: str
    kind: str
    name: str
    says: str
    state: str
    due: str
    due_in: str
    due_rule: str
    certificate: str
    issuer: str
    opened: str
    left: str
    left_verdict: str


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

    standard_lots: tuple[StandardLotLine, ...]
    recipes: tuple[RecipeLine, ...]
    may_keep: bool


@dataclass(frozen=True, slots=True)
class Fact:
    """A labelled value."""

    label: str
    value: str


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
