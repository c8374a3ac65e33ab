"""The trail as JSON lines: every row as it is kept, for a machine to check without this program."""

from collections.abc import Iterable, Mapping
from typing import Any

from server.lab.canonical import canonical


def trail_json_lines(rows: Iterable[Mapping[str, Any]]) -> bytes:
    """Return one row a line, as canonical text.

    ``hash`` is the SHA-256 of ``previous_hash``, a line feed, and the canonical text of the other
    keys; ``body`` is text in it.
    """
    return "".join(f"{canonical(dict(row))}\n" for row in rows).encode("utf-8")
