"""Sending a sheet back to the bench, with remarks on its rows."""

from collections.abc import Sequence
from dataclasses import asdict, dataclass, replace
from datetime import datetime

from sqlalchemy.orm import Session

from server.lab.actor import Actor
from server.lab.free_text import read_text
from server.lab.refusal import NotAllowed, Unacceptable
from server.lab.rig import rig_of
from server.lab.roles import Act
from server.lab.segregation import countersign_refusal
from server.lab.sheet_facts import RowRemark, SheetFacts
from server.lab.slots import place_words, row_at
from server.procedures.acts import Thing, note_act
from server.procedures.bench import lock_sheet, need_revision
from server.procedures.countersign import waiting_parts
from server.records.queries.load_sheet import load_sheet_facts
from server.records.queries.sheet_trail import SENT_BACK_ACT

MOST_ROW_REMARKS = 50


@dataclass(frozen=True, slots=True)
class SendBack:
    """A sheet sent back to the bench, with a remark on the whole, remarks on rows, or both."""

    sheet_id: str
    revision: int
    remark: str = ""
    remarks: tuple[RowRemark, ...] = ()


def send_back_sheet(session: Session, command: SendBack, *, actor: Actor, now: datetime) -> int:
    """Send a sheet back with what shall be looked at again; return its new revision.

    Raises:
        NotAllowed: one's own work, or a sheet that does not wait.
        Unacceptable: nothing is said, or a remark is on a row that the sheet does not have.
        Stale: the sheet has changed since it was looked at.
    """
    actor.need(Act.COUNTERSIGN)
    sheet = lock_sheet(session, command.sheet_id)
    facts = load_sheet_facts(session, sheet.id)
    waiting_parts(facts)
    refusal = countersign_refusal(facts, actor.person_id)
    if refusal:
        raise NotAllowed(refusal.replace("countersigns", "sends it back"))
    need_revision(sheet, command.revision)
    remark = read_text(command.remark, "remark")
    rows = _row_remarks(facts, command.remarks)
    if not remark and not rows:
        says = "Say in a remark what shall be looked at again, or write it at the row."
        raise Unacceptable(says, field="remark", example="replicate 3: is 18.46 a slip?")
    told = [remark, *(f"{where}: {one.text}" for where, one in rows)]
    why = "\n".join(one for one in told if one)
    sheet.sent_back_at = now
    sheet.sent_back_remark = why
    sheet.revision += 1
    session.flush()
    body = {"remark": remark, "remarks": [asdict(one) for _, one in rows]}
    thing = Thing("sheet", sheet.id, sheet.number)
    note_act(session, SENT_BACK_ACT, thing, actor=actor, now=now, why=why, body=body)
    return sheet.revision


def _row_remarks(facts: SheetFacts, remarks: Sequence[RowRemark]) -> list[tuple[str, RowRemark]]:
    """Return the remarks on rows, each with its row in words; empty ones are left out."""
    if len(remarks) > MOST_ROW_REMARKS:
        says = f"Up to {MOST_ROW_REMARKS} rows take a remark at a time; these are {len(remarks)}."
        raise Unacceptable(says, field="remarks")
    found: dict[tuple[int, str, int], tuple[str, RowRemark]] = {}
    recipe, rig = facts.recipe.document, rig_of(facts.instruments)
    for number, one in enumerate(remarks):
        place = (one.replicate, one.slot, one.segment)
        where = place_words(one.replicate, row_at(recipe, rig, place).label)
        try:
            text = read_text(one.text, f"The remark on {where}")
        except Unacceptable as refused:
            refused.field = f"remarks[{number}].text"
            raise
        if text and place in found:
            says = f"{where} has two remarks; write them as one."
            raise Unacceptable(says, field=f"remarks[{number}]")
        if text:
            found[place] = (where, replace(one, text=text))
    return list(found.values())
