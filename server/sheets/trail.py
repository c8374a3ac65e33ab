"""The trail as it is read, with the badge that says whether its chain holds."""

from dataclasses import dataclass

from server.sheets.countersign import TrailLine


@dataclass(frozen=True, slots=True)
class TrailPage:
    """A page of the trail, newest first.

    ``badge`` says whether the chain holds and up to where; ``seal`` is the number and hash of the
    last act, as the command line prints and takes them. ``asked`` is the filter, as an address
    takes it.
    """

    lines: tuple[TrailLine, ...]
    holds: bool
    badge: str
    seal: str
    person: str
    thing: str
    day: str
    words: str
    asked: str
    people: tuple[str, ...]
    page: int
    newer_url: str | None
    older_url: str | None
