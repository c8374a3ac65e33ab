"""Whether an entry came late, or was written by a clock that was wrong."""

import json
from collections.abc import Iterable
from typing import Any

from server.lab.device_clock import CLOCK_OFF, is_ahead
from server.lab.ink import WrittenEntry
from server.sheets.parts.telling import count_words


def clocks_off(acts: Iterable[Any]) -> dict[str, int]:
    """Return by how many seconds the clock was ahead by which entries were written, by entry.

    ``acts`` are rows of a sheet's trail; entries that were written by a good clock are left out.
    """
    found: dict[str, int] = {}
    for act in acts:
        body = json.loads(act.body)
        if CLOCK_OFF in body:
            found |= {one["id"]: body[CLOCK_OFF] for one in body["entries"]}
    return found


def clock_says(entry: WrittenEntry, skew_s: int | None) -> str:
    """Return in words how late an entry came and how wrong its clock was; empty where all is well.

    ``skew_s``: by how many seconds its clock is known to have been ahead.
    """
    if entry.device_at is None:
        return ""
    apart_s = round((entry.received_at - entry.device_at).total_seconds())
    if skew_s is None and is_ahead(entry.device_at, entry.received_at):
        skew_s = -apart_s
    told = []
    if entry.late:
        told.append(f"came {_about(apart_s + (skew_s or 0))} after it was written")
    if skew_s is not None:
        way = "ahead" if skew_s > 0 else "behind"
        told.append(f"its clock was {_about(abs(skew_s))} {way}")
    return "; ".join(told)


def _about(seconds: int) -> str:
    minutes = round(seconds / 60)
    if minutes < 120:
        return f"{minutes} min"
    hours = round(seconds / 3600)
    return count_words(hours, "hour") if hours < 48 else count_words(round(hours / 24), "day")
