"""Whether what is kept of a bench sheet is what the trail noted when it was written.

Everything here gets rows as they are stored and says in a sentence what does not hold.
"""

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from datetime import datetime
from typing import Any

from server.lab.canonical import digest
from server.lab.ink import entry_digest
from server.lab.signing import COUNTERSIGNED, MEASURED, signature_holds

#: The act that notes a certificate's digest.
ISSUED = "issued a certificate"
HANDED_IN = "handed in a bench sheet"
_BEGAN, _COUNTERSIGNED, _ABANDONED = (
    "began a bench sheet",
    "countersigned",
    "abandoned a bench sheet",
)
_MOST_SHOWN = 60
#: What every release noted of an entry, and what it is called in a sentence.
_NOTED_OF_ENTRY = {
    "text": "text", "unit": "unit", "slot": "row", "replicate": "replicate", "segment": "filling",
    "strikes": "strike-through", "reason": "reason", "position": "place in the order",
}  # fmt: skip


@dataclass(frozen=True, slots=True)
class NotedAct:
    """An act as the trail tells it."""

    seq: int
    at: datetime
    person_id: str | None
    act: str
    kind: str
    thing_id: str
    thing_name: str
    why: str | None
    body: Mapping[str, Any]


@dataclass(frozen=True, slots=True)
class KeptSheet:
    """All rows of a sheet with the acts on it and on its certificates, oldest first.

    ``row``, ``entries`` and the rest have the columns of their tables as attributes; evaluations'
    snapshots and certificates' documents are canonical text; a certificate has its ``lot_name``.
    """

    id: str
    row: Any
    acts: Sequence[NotedAct]
    entries: Sequence[Any]
    evaluations: Sequence[Any]
    signatures: Sequence[Any]
    certificates: Sequence[Any]

    def done(self, act: str) -> list[NotedAct]:
        """Return the acts of a name, oldest first."""
        return [one for one in self.acts if one.act == act]

    @property
    def name(self) -> str:
        """The sheet as a sentence calls it."""
        number = self.row.number if self.row else self.acts[0].thing_name
        return f"sheet {number}"


def first_broken(kept: KeptSheet) -> str | None:
    """Return in a sentence the first thing of a sheet that is not as noted; None if all is."""
    return next(
        (
            says
            for part in (_sheet, _entries, _evaluations, _signatures, _certificates)
            for says in part(kept)
        ),
        None,
    )


def first_broken_entry(kept: KeptSheet) -> str | None:
    """Return in a sentence the first entry that is not as noted; None if all are."""
    return next(_entries(kept), None)


def noted_briefly(kept: KeptSheet) -> int:
    """Return how many entries an earlier release noted by their main columns only."""
    return sum(1 for _, line in _noted_entries(kept).values() if "digest" not in line)


def _sheet(kept: KeptSheet) -> Iterator[str]:
    began, row = kept.done(_BEGAN), kept.row
    if row is None:
        first = kept.acts[0]
        yield f"Sheet {first.thing_name}, noted in row {first.seq}, is not there."
        return
    if not began:
        yield f"Sheet {row.number} was never noted in the trail."
        return
    told = (began[0].thing_name, began[0].at, began[0].person_id)
    if told != (row.number, row.begun_at, row.begun_by):
        yield f"Sheet {row.number} is not the one that row {began[0].seq} says was begun."
    for act, column in ((_COUNTERSIGNED, "countersigned_at"), (_ABANDONED, "abandoned_at")):
        acts = kept.done(act)
        if getattr(row, column) != (acts[-1].at if acts else None):
            yield f"Whether and when sheet {row.number} was {act.split()[0]} is not as noted."
    handed_in = kept.done(HANDED_IN)
    last = handed_in[-1].body.get("evaluation") if handed_in else None
    if row.evaluation_id != last and (row.evaluation_id or row.countersigned_at):
        yield f"Sheet {row.number} shows another evaluation than the one that was handed in."


def _noted_entries(kept: KeptSheet) -> dict[str, tuple[NotedAct, Mapping[str, Any]]]:
    return {
        line["id"]: (act, line) for act in kept.acts for line in _lines(act.body.get("entries"))
    }


def _lines(lines: object) -> list[Mapping[str, Any]]:
    found = lines if isinstance(lines, list) else []
    return [one for one in found if isinstance(one, dict) and "id" in one]


def _entries(kept: KeptSheet) -> Iterator[str]:
    noted = _noted_entries(kept)
    for entry in kept.entries:
        act, line = noted.pop(entry.id, (None, {}))
        where = f"Entry {entry.position} of {kept.name}"
        if act is None:
            yield f"{where} was never noted in the trail."
        elif "digest" not in line or line["digest"] != entry_digest(entry):
            yield from _unlike(entry, line, act, where)
    for act, line in noted.values():
        yield f"Entry {line.get('position')} of {kept.name}, noted in row {act.seq}, is not there."


def _unlike(entry: Any, line: Mapping[str, Any], act: NotedAct, where: str) -> Iterator[str]:
    """Say in what an entry is not as noted; one that was noted briefly may be."""
    for column, word in _NOTED_OF_ENTRY.items():
        was, stands = line.get(column), getattr(entry, column)
        if was != stands:
            told = f"row {act.seq} noted the {word} {_shown(was)}"
            yield f"{where}: {told}; {_shown(stands)} stands there."
            return
    if "digest" in line:
        yield f"{where}: what came with its text was changed after row {act.seq} noted it."
    elif (entry.person_id, entry.posted_by, entry.received_at) != (
        act.person_id, act.person_id, act.at,
    ):  # fmt: skip
        yield f"{where}: who wrote it, or when, is not what row {act.seq} noted."


def _shown(value: object) -> str:
    if value in {None, ""}:
        return "nothing"
    text = str(value)
    return f"“{text}”" if len(text) <= _MOST_SHOWN else f"“{text[:_MOST_SHOWN]}…”"


def _evaluations(kept: KeptSheet) -> Iterator[str]:
    noted = {one.body.get("evaluation"): one for one in kept.done(HANDED_IN)}
    for one in kept.evaluations:
        act = noted.pop(one.id, None)
        if act is None:
            yield f"An evaluation of {kept.name} was never noted in the trail."
            continue
        as_noted = digest(one.snapshot) == one.snapshot_digest == act.body.get("snapshot_digest")
        # earlier releases noted the digest only
        told = all(
            act.body.get(name, getattr(one, name)) == getattr(one, name)
            for name in ("calculation", "input_digest")
        )
        if not as_noted or not told or one.made_at != act.at:
            yield f"The evaluation of {kept.name} is not the one that was signed in row {act.seq}."
    for act in noted.values():
        yield f"The evaluation of {kept.name}, signed in row {act.seq}, is not there."


def _signatures(kept: KeptSheet) -> Iterator[str]:
    noted: dict[Any, tuple[NotedAct, str, Any]] = {}
    evaluation = None
    for act in kept.acts:
        if act.act == HANDED_IN:
            evaluation = act.body.get("evaluation")
            noted[act.body.get("signature")] = (act, MEASURED, evaluation)
        elif act.act == _COUNTERSIGNED:
            noted[act.body.get("signature")] = (act, COUNTERSIGNED, evaluation)
    snapshots = {one.id: one.snapshot for one in kept.evaluations}
    for one in kept.signatures:
        found = noted.pop(one.id, None)
        if found is None:
            yield f"A signature of {one.printed_name} on {kept.name} was never noted in the trail."
            continue
        act, meaning, rests_on = found
        as_noted = (
            one.signed_digest == act.body.get("signed_digest")
            and (one.meaning, one.person_id, one.at) == (meaning, act.person_id, act.at)
            and one.evaluation_id == rests_on
        )
        bound = digest(snapshots.get(one.evaluation_id, ""))
        if not as_noted or not signature_holds(one, kept, bound):
            yield (
                f"The signature of {one.printed_name} ({one.meaning}) on {kept.name} does not "
                f"belong to what stands there; row {act.seq} noted it."
            )
    for act, meaning, _ in noted.values():
        yield f"The signature ({meaning}) on {kept.name}, noted in row {act.seq}, is not there."


def _certificates(kept: KeptSheet) -> Iterator[str]:
    noted = {one.thing_id: one for one in kept.done(ISSUED)}
    handed_in, signed = kept.done(HANDED_IN), kept.done(_COUNTERSIGNED)
    for one in kept.certificates:
        act = noted.pop(one.id, None)
        if act is None:
            yield f"Certificate {one.number} was never noted in the trail."
            continue
        body = act.body
        made_anew = digest(one.document)
        if not made_anew == one.document_digest == body.get("document_digest"):
            yield f"Certificate {one.number} is not the text that was issued."
            continue
        stands = (one.number, one.issued_at, one.lot_name, one.valid_until.isoformat())
        told = (act.thing_name, act.at, body.get("lot"), body.get("valid_until"))
        rests = (one.evaluation_id, one.replaces_id, one.sheet_id, one.lot_id)
        rested = (
            handed_in[-1].body.get("evaluation") if handed_in else None,
            signed[-1].body.get("replaces") if signed else None,
            kept.id,
            kept.row.lot_id if kept.row else None,
        )
        if stands != told or rests != rested:
            yield f"What stands beside certificate {one.number} is not what row {act.seq} noted."
        elif one.trail_seq != body.get("trail_seq", one.trail_seq) or one.trail_seq >= act.seq:
            yield f"Certificate {one.number} is anchored to another row than row {act.seq} noted."
    numbers = {one.number for one in kept.certificates}
    for act in signed:
        if act.body.get("certificate") not in numbers:
            number = act.body.get("certificate")
            yield f"Certificate {number}, noted in row {act.seq}, is not there."
