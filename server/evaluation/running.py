"""What an open bench sheet shows so far: running values, mean, spread, findings."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from server.evaluation.entrance import evaluate, running_values
from server.evaluation.from_sheet import PreparedSheet
from server.evaluation.record_fields import RecordProblem
from server.lab.lot_log import is_drying_step
from server.statistics.spread import summarize

#: What findings say of a sheet that is still being written is told by its missing rows instead.
_WAITS_FOR_ROW = {
    "end point": ("indicator",),
    "temperature": ("temperature",),
    "blank": ("blank",),
}


@dataclass(frozen=True, slots=True)
class RunningReplicate:
    """One replicate's value so far in mol/L, or None with what it lacks."""

    label: str
    value: float | None
    says: str
    excluded: bool


@dataclass(frozen=True, slots=True)
class Running:
    """All that can be told before the sheet is whole.

    ``mean`` in mol/L and ``rsd_percent`` are there from two counting values on; ``to_go`` is how
    many replicates are still wanted; ``finding`` the first one that does not hold.
    """

    replicates: tuple[RunningReplicate, ...]
    mean: float | None
    rsd_percent: float | None
    to_go: int
    finding: Mapping[str, Any] | None


def running(prepared: PreparedSheet, *, wanted: int) -> Running:
    """Return the running values of a sheet; an odd record gives fewer of them, never an error."""
    values = running_values(prepared.draft)
    replicates = tuple(
        RunningReplicate(one["label"], one["value"], one["says"], one["excluded"] is not None)
        for one in values
    )
    counting = [one.value for one in replicates if one.value is not None and not one.excluded]
    to_go = max(0, wanted - len(counting))
    if len(counting) < 2:
        return Running(replicates, None, None, to_go, None)
    spread = summarize(counting)
    finding = _first_that_does_not_hold(prepared, replicates, to_go=to_go)
    return Running(replicates, spread.mean, spread.rsd_percent, to_go, finding)


def _first_that_does_not_hold(
    prepared: PreparedSheet, replicates: Sequence[RunningReplicate], *, to_go: int
) -> Mapping[str, Any] | None:
    listed = prepared.draft["replicates"]
    whole = [
        one
        for one, run in zip(listed, replicates, strict=True)
        if run.value is not None or run.excluded
    ]
    document = {**prepared.draft, "replicates": whole}
    try:
        findings = evaluate(document, circumstances=prepared.circumstances)["findings"]
    except RecordProblem:
        return None
    missing = {one.slot for one in prepared.missing if one.replicate == 0}
    for one in findings:
        unfinished = one["name"] == "replicates" and to_go > 0
        waits = missing.intersection(_WAITS_FOR_ROW.get(one["name"], ())) or (
            one["name"] == "drying" and any(is_drying_step(slot) for slot in missing)
        )
        if one["verdict"] != "holds" and not unfinished and not waits:
            return dict(one)
    return None
