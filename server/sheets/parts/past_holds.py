"""Holds as they were, with how they ended."""

from server.records.queries.list_holds import PastHold
from server.sheets.parts.telling import moment_words


def hold_words(past: PastHold, zone: str) -> str:
    """Return a hold with its release, as one would tell it."""
    says = f"Held by {past.held_by}, {moment_words(past.held_at, zone)}: {past.reason}"
    if past.released_at is None:
        return f"{says} (not released)"
    at = moment_words(past.released_at, zone)
    return f"{says}. Released by {past.released_by}, {at}: {past.release_reason}"
