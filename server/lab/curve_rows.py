"""What stands in a sheet's rows of curves."""

from collections.abc import Iterable

from server.lab.curve_entry import SLOT, read_curve_entry
from server.lab.ink import WrittenEntry, standing


def same_original(entries: Iterable[WrittenEntry], sha256: str, *, beside: int) -> int | None:
    """Return the replicate whose standing curve is of the same bytes, or None.

    ``beside`` is the replicate that is asked for; its own curve does not count.
    """
    for (replicate, slot, _), entry in standing(entries).items():
        if slot != SLOT or replicate == beside:
            continue
        kept = read_curve_entry(entry.raw).file
        if kept is not None and kept.sha256 == sha256:
            return replicate
    return None
