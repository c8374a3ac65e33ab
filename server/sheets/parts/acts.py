"""Lines of the trail as people read them."""

import json
from collections.abc import Iterable, Iterator, Mapping
from typing import Any

from server.lab.integrity import HANDED_IN
from server.records.tables.trail import TrailRow
from server.sheets.countersign import TrailLine
from server.sheets.parts.telling import moment_words, unit_words


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
            details="; ".join(_told(_shown(row))),
        )
        for row in rows
    )


def _shown(row: TrailRow) -> Any:
    """Return what a row says beside its columns; not a number before it was certified."""
    body = json.loads(row.body)
    if row.act == HANDED_IN and isinstance(body, dict):
        # earlier releases noted it
        body.pop("reported", None)
    return body


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
            if isinstance(one, Mapping) and {"slot", "text"} <= one.keys():
                yield _entry(one)
            else:
                yield from _told(one, f"{name} {place}")
    elif body not in (None, ""):
        yield f"{name} {_plain(body)}"


def _entry(one: Mapping[str, Any]) -> str:
    """Return an entry as it was written: where, what, and why something was struck through."""
    where = f"replicate {one['replicate']}" if one["replicate"] else "sheet"
    filling = f", filling {one['segment']}" if one["segment"] > 1 else ""
    slot = one["slot"].partition(":")[2] or one["slot"].replace("_", " ")
    written = f"{one['text']} {unit_words(one.get('unit'))}".strip() or "nothing"
    why = f" ({one['reason']})" if one.get("reason") else ""
    struck = ", an earlier value struck through" if one.get("strikes") else ""
    return f"{where}, {slot}{filling}: {written}{struck}{why}"


def _plain(value: Any) -> str:
    if isinstance(value, bool):
        return "yes" if value else "no"
    return str(value)
