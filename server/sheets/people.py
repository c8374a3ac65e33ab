"""People and the laboratory's settings as the steward reads them."""

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class PersonLine:
    """A person in the list."""

    id: str
    sign_in_name: str
    printed_name: str
    initials: str
    roles: tuple[str, ...]
    active: bool
    revision: int


@dataclass(frozen=True, slots=True)
class PeoplePage:
    """The people page."""

    people: tuple[PersonLine, ...]
    roles: tuple[str, ...]
    laboratory: str
    address: str
    zone: str
    own_signature: bool
    shelf_open: bool
    revision: int


@dataclass(frozen=True, slots=True)
class Chrome:
    """What every page shows around itself: who is here, where, how many sheets wait.

    ``person_id`` keeps one person's unsent entries apart from another's on a shared tablet.
    """

    laboratory: str
    printed_name: str | None
    initials: str | None
    roles: tuple[str, ...]
    waiting: int
    person_id: str | None = None
