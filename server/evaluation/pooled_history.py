"""Repeatability of one replicate, pooled from earlier results by the same recipe."""

from collections.abc import Iterable, Mapping
from math import fsum, sqrt
from typing import Any

from server.evaluation.circumstances import Pooled


def pooled_history(spreads: Iterable[Mapping[str, Any]]) -> Pooled | None:
    """Return s_p² = Σ(nᵢ − 1)·sᵢ² / Σ(nᵢ − 1), relative, with its degrees of freedom.

    ``spreads`` are those of bench results (``n``, ``rsd_percent``); None where none of them has two
    replicates or more (JCGM 100, H.5; ISO 5725-2, 7.4).
    """
    known = [
        (int(one["n"]) - 1, float(one["rsd_percent"]) / 100.0)
        for one in spreads
        if one.get("rsd_percent") is not None and int(one["n"]) > 1
    ]
    dof = sum(count for count, _ in known)
    if dof == 0:
        return None
    s = sqrt(fsum(count * s * s for count, s in known) / dof)
    sheets = "1 earlier sheet" if len(known) == 1 else f"{len(known)} earlier sheets"
    return Pooled(relative_s=s, dof=float(dof), source=sheets)
