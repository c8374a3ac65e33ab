"""What a person is told of the bottles and lots that she watches, and her tokens."""

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Notice:
    """One change of a watched bottle or lot; ``at`` as ISO 8601, ``state`` the one after it."""

    at: str
    when: str
    title: str
    url: str
    says: str
    state: str
    unread: bool


@dataclass(frozen=True, slots=True)
class WatchLine:
    """A bottle or lot that is watched."""

    kind: str
    code: str
    url: str
    title: str
    state: str
    since: str


@dataclass(frozen=True, slots=True)
class NoticesPage:
    """The notices, newest first; ``read_until`` is the instant of the newest.

    ``mail_problem`` says why the last letter that waits could not be sent.
    """

    notices: tuple[Notice, ...]
    unread: int
    read_until: str
    watches: tuple[WatchLine, ...]
    address: str
    sends_mail: bool
    mail_problem: str


@dataclass(frozen=True, slots=True)
class TokenLine:
    """A token as its owner sees it; ``holds`` says whether it still opens anything."""

    id: str
    name: str
    scopes: tuple[str, ...]
    made: str
    good_until: str
    last_used: str
    holds: bool
    says: str


@dataclass(frozen=True, slots=True)
class OwnPage:
    """One's own page: tokens for scripts and what a new one may do."""

    tokens: tuple[TokenLine, ...]
    scopes: tuple[tuple[str, str], ...]
