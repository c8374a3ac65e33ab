"""The snapshot of an evaluation: canonical text with everything it used, and its replay."""

import json
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from server.evaluation.calculations import calculation
from server.evaluation.circumstances import Circumstances, read_circumstances
from server.evaluation.circumstances import to_document as circumstances_document
from server.evaluation.constants import read_constants
from server.evaluation.constants import to_document as constants_document
from server.evaluation.curve_readings import read_taken
from server.evaluation.entrance import Task, evaluate_task, make_task
from server.lab.canonical import canonical, digest

__all__ = ["Replay", "Snapshot", "canonical", "digest", "make_snapshot", "replay"]

FORMAT = "evaluation-snapshot/1"
# Another machine's last bits: far below any digit of u that is printed.
AGREEMENT_OVER_U = 1e-6


@dataclass(frozen=True, slots=True)
class Snapshot:
    """Canonical text of an evaluation with its SHA-256."""

    text: str
    digest: str


@dataclass(frozen=True, slots=True)
class Replay:
    """A snapshot evaluated again: shift of c as a fraction of u, and what does not agree."""

    agrees: bool
    shift_over_u: float
    u_ratio: float
    says: str
    result: dict[str, Any]


def make_snapshot(
    document: Mapping[str, Any],
    circumstances: Circumstances | None,
    result: Mapping[str, Any],
    *,
    trials: int | None = None,
    seed: int = 1,
) -> Snapshot:
    """Return the snapshot of an evaluation: record, circumstances, constants, calculation, result.

    Where there are curves, their end points as found are part of it beside the points.
    ``trials`` and ``seed`` are those that the evaluation was given.
    """
    task = make_task(document, circumstances=circumstances, trials=trials, seed=seed)
    held: dict[str, Any] = {
        "format": FORMAT,
        "record": task.document,
        "circumstances": circumstances_document(task.circumstances),
        "constants": constants_document(task.constants),
        "calculation": result["calculation"],
        "trials": trials,
        "seed": seed,
        "result": result,
    }
    if task.curves:
        held["curves"] = [one.to_document() for one in task.curves]
    text = canonical(held)
    return Snapshot(text=text, digest=digest(text))


def replay(snapshot_text: str, *, expected_digest: str | None = None) -> Replay:
    """Evaluate a snapshot again, with the constants and the calculation version that it names.

    It agrees where the digest is the expected one, the record is the one that the result names,
    and c and u come out again within a millionth of u.

    Raises:
        UnknownCalculation: the snapshot names a calculation that this program does not have.
    """
    held = json.loads(snapshot_text)
    named = held["calculation"]
    result = evaluate_task(
        Task(
            document=held["record"],
            circumstances=read_circumstances(held["circumstances"]),
            constants=read_constants(held["constants"]),
            calculation=calculation(named["name"], named["version"]),
            trials=held["trials"],
            seed=held["seed"],
            curves=read_taken(held.get("curves", ())),
        )
    )
    was, now = held["result"]["concentration"], result["concentration"]
    shift = (now["value"] - was["value"]) / now["u"]
    ratio = was["u"] / now["u"]
    doubts = []
    if expected_digest is not None and digest(snapshot_text) != expected_digest:
        doubts.append("the text is not the one that was signed")
    if held["result"]["input_digest"] != result["input_digest"]:
        doubts.append("the record is not the one that the result names")
    if abs(shift) > AGREEMENT_OVER_U or abs(ratio - 1.0) > AGREEMENT_OVER_U:
        doubts.append(f"c moves by {shift:.3g} u, u was {ratio:.6g} times today's")
    if was["reported"] != now["reported"]:
        doubts.append(f"it was printed as {was['reported']}, and comes out as {now['reported']}")
    says = "; ".join(doubts) if doubts else "The same numbers come out again."
    return Replay(agrees=not doubts, shift_over_u=shift, u_ratio=ratio, says=says, result=result)
