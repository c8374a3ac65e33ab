"""The trail as it is read, with the badge that says whether its chain holds."""

from dataclasses import dataclass

from server.sheets.countersign import TrailLine


@dataclass(frozen=True, slots=True)
class TrailPage:
    """A page of the trail, newest first."""

    lines: tuple[TrailLine, ...]
    holds: bool
    badge: str
    person: str
    thing: str
    day: str
    people: tuple[str, ...]
    page: int
    newer_url: str | None
    older_url: str | None
