"""Who may do what: the laboratory's roles and acts."""

from collections.abc import Iterable
from enum import StrEnum


class Role(StrEnum):
    """A role that a person holds; *steward* excludes all others."""

    ANALYST = "analyst"
    COUNTERSIGNER = "countersigner"
    KEEPER = "keeper"
    STEWARD = "steward"
    READER = "reader"


class Act(StrEnum):
    """An act that asks for a role."""

    MAKE_UP = "make up a lot"
    BOTTLE = "fill bottles"
    WRITE = "write entries"
    HAND_IN = "hand in a bench sheet"
    COUNTERSIGN = "countersign"
    HOLD = "hold a lot or bottle"
    RELEASE = "release a hold"
    KEEP = "keep standard lots, instruments and recipes"
    LABEL = "print labels"
    LOG = "write in the log of a standard lot or instrument"
    USE = "write down what a bottle was used for"
    OVERRIDE = "let something out of date be used"
    PROPOSE_PULL = "propose a pull"
    CONFIRM_PULL = "confirm a pull"
    ADMINISTER = "keep people and settings"
    READ = "read the notebook"
    READ_UNCERTIFIED = "read a number that is not certified yet"


_HOLDERS: dict[Act, frozenset[Role]] = {
    Act.MAKE_UP: frozenset({Role.ANALYST}),
    Act.BOTTLE: frozenset({Role.ANALYST}),
    Act.WRITE: frozenset({Role.ANALYST}),
    Act.HAND_IN: frozenset({Role.ANALYST}),
    Act.COUNTERSIGN: frozenset({Role.COUNTERSIGNER}),
    Act.HOLD: frozenset({Role.ANALYST, Role.COUNTERSIGNER, Role.KEEPER}),
    Act.RELEASE: frozenset({Role.KEEPER, Role.COUNTERSIGNER}),
    Act.KEEP: frozenset({Role.KEEPER}),
    Act.LABEL: frozenset({Role.ANALYST, Role.KEEPER}),
    Act.LOG: frozenset({Role.ANALYST, Role.KEEPER}),
    Act.USE: frozenset({Role.ANALYST, Role.KEEPER}),
    Act.OVERRIDE: frozenset({Role.KEEPER}),
    Act.PROPOSE_PULL: frozenset({Role.KEEPER}),
    Act.CONFIRM_PULL: frozenset({Role.COUNTERSIGNER}),
    Act.ADMINISTER: frozenset({Role.STEWARD}),
    Act.READ: frozenset(Role),
    Act.READ_UNCERTIFIED: frozenset({Role.ANALYST, Role.COUNTERSIGNER}),
}


def may(roles: Iterable[str], act: Act) -> bool:
    """Say whether somebody with these roles may do this act."""
    return bool(_HOLDERS[act] & {Role(role) for role in roles})


def holders(act: Act) -> list[str]:
    """Return the roles that may do this act, in alphabetical order."""
    return sorted(_HOLDERS[act])
