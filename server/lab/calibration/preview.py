"""A run while it is being done: volumes as they come, and the outcome as soon as there is one."""

import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from server.lab.calibration.run import (
    WARE_OF_KIND,
    JudgedRun,
    UsedInstrument,
    judge_run,
    with_instruments,
)
from server.lab.calibration.water_run import read_water_run
from server.lab.refusal import Unacceptable
from server.metrology.gravimetry import weighed_volume

_PLACE = re.compile(r"weighings\[(?P<index>\d+)\]")


@dataclass(frozen=True, slots=True)
class Preview:
    """What a run comes to so far.

    ``volumes`` are the V20 in mL of the weighings that are whole, by their place; ``unfinished``
    the places of those that were begun; ``judged`` is None until there is an outcome, and ``says``
    with ``field`` tell what stands against it.
    """

    volumes: Mapping[int, float]
    unfinished: tuple[int, ...]
    judged: JudgedRun | None
    says: str = ""
    field: str | None = None


def preview_run(
    kind: str, document: Mapping[str, Any], used: Sequence[UsedInstrument] = ()
) -> Preview:
    """Return what a run comes to so far; nothing that is still missing is refused."""
    if kind not in WARE_OF_KIND:
        return _judged(kind, document, used, {}, ())
    rows = document.get("weighings") or ()
    whole = [i for i, one in enumerate(rows) if _is_whole(one)]
    unfinished = tuple(i for i in range(len(rows)) if i not in whole)
    if not whole:
        return Preview({}, unfinished, None, "Weigh once, and its volume stands here.", "weighings")
    wares = WARE_OF_KIND[kind]
    part = {"kind": wares[0], **document, "weighings": [rows[i] for i in whole]}
    try:
        run = read_water_run(with_instruments(part, used))
    except Unacceptable as problem:
        return Preview({}, unfinished, None, *_at_place(problem, whole))
    volumes = {
        whole[one.index]: weighed_volume(one.weighing, run.ware).volume_mL for one in run.weighings
    }
    return _judged(kind, part, used, volumes, unfinished, whole=whole)


def _judged(
    kind: str,
    document: Mapping[str, Any],
    used: Sequence[UsedInstrument],
    volumes: Mapping[int, float],
    unfinished: tuple[int, ...],
    *,
    whole: Sequence[int] = (),
) -> Preview:
    try:
        return Preview(volumes, unfinished, judge_run(kind, document, used))
    except Unacceptable as problem:
        return Preview(volumes, unfinished, None, *_at_place(problem, whole))


def _is_whole(row: Any) -> bool:
    if not isinstance(row, Mapping):
        return False
    has = {key for key in ("before", "after", "net", "water") if row.get(key) not in (None, "")}
    return "water" in has and ("net" in has or {"before", "after"} <= has)


def _at_place(problem: Unacceptable, whole: Sequence[int]) -> tuple[str, str | None]:
    """Return a refusal with the places that the weighings have in the whole run."""

    def placed(found: re.Match[str]) -> str:
        index = int(found["index"])
        return f"weighings[{whole[index] if index < len(whole) else index}]"

    field = None if problem.field is None else _PLACE.sub(placed, problem.field)
    return _PLACE.sub(placed, problem.says), field
