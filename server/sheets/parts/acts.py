"""Lines of the trail as people read them."""

import json
from collections.abc import Iterable, Iterator, Mapping
from typing import Any

from server.records.tables.trail import TrailRow
from server.sheets.countersign import TrailLine
from server.sheets.parts.telling import moment_words


def trail_lines(rows: Iterable[TrailRow], zone: str) -> tuple[TrailLine, ...]:
    """Return rows of the trail in the order given."""
    return tuple(
        TrailLine(
            seq=row.seq,
            at=row.at.isoformat(),
            says_at=moment_words(row.at, zone),
            who=row.person_name,
            act=row.act,
            thing=row.thing_name,
            kind=row.kind,
            why=row.why,
            details="; ".join(_told(json.loads(row.body))),
        )
        for row in rows
    )


def _told(body: Any, name: str = "") -> Iterator[str]:
    """Yield what a body says, leaf by leaf, empty values left out."""
    if isinstance(body, Mapping):
        for key, value in body.items():
            yield from _told(value, f"{name} {key}".strip().replace("_", " "))
    elif isinstance(body, list):
        if body and all(not isinstance(one, dict | list) for one in body):
            yield f"{name} {', '.join(str(one) for one in body)}"
            return
        for place, one in enumerate(body, start=1):
            yield from _told(one, f"{name} {place}")
    elif body not in (None, ""):
        yield f"{name} {_plain(body)}"


def _plain(value: Any) -> str:
    if isinstance(value, bool):
        return "yes" if value else "no"
    return str(value)
