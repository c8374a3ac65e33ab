"""Which lines of a log count: in ink, struck through by another line with a reason."""

from collections.abc import Iterable
from datetime import datetime

from server.lab.sheet_facts import LogFact


def standing_lines(
    log: Iterable[LogFact], what: str, *, as_of: datetime | None = None
) -> tuple[LogFact, ...]:
    """Return the lines of one kind that are not struck through, as they stood at an instant."""
    return tuple(
        one
        for one in log
        if one.what == what
        and (as_of is None or one.at <= as_of)
        and (one.struck is None or (as_of is not None and one.struck.at > as_of))
    )
