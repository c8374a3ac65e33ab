"""The sheets that wait for a second person, longest first."""

from dataclasses import replace
from datetime import datetime

from sqlalchemy.orm import Session

from server.lab.actor import Actor
from server.lab.ink import strikes
from server.lab.refusal import NotAllowed
from server.lab.roles import Act, holders
from server.lab.segregation import countersign_refusal
from server.lab.sheet_facts import SheetFacts
from server.lab.states import HANDED_IN
from server.records.queries.list_sheets import done_sheet_ids, waiting_sheet_ids
from server.records.queries.load_sheet import load_many_sheet_facts, load_sheet_facts
from server.sheets.countersign import Queue, QueueLine
from server.sheets.parts.doors import may_read_number, need_reader
from server.sheets.parts.sheet_lines import sheet_title
from server.sheets.parts.signed import countersignature, signed_findings
from server.sheets.parts.telling import count_words, moment_words, span_words

DONE_SHOWN = 8


def open_queue(session: Session, *, actor: Actor | None, now: datetime) -> Queue:
    """Return all sheets that wait, with what stands out, and those countersigned last.

    Raises:
        NotSignedIn: a visitor.
    """
    reader = need_reader(actor)
    waiting, done = waiting_sheet_ids(session), done_sheet_ids(session, most=DONE_SHOWN)
    facts = {one.id: one for one in load_many_sheet_facts(session, [*waiting, *done])}
    return Queue(
        waiting=tuple(_waiting(facts[one], reader, now) for one in waiting),
        done=tuple(_done(facts[one]) for one in done),
    )


def need_waiting(session: Session, sheet_id: str, *, actor: Actor | None, now: datetime) -> None:
    """Refuse a sheet that does not wait, before a password is asked for it.

    Raises:
        NotFound: there is no such sheet.
        NotAllowed: it does not wait.
    """
    del now
    need_reader(actor)
    state = load_sheet_facts(session, sheet_id).state
    if state != HANDED_IN:
        raise NotAllowed(f"This sheet is {state}; it does not wait for a second person.")


def countersign_problem(facts: SheetFacts, reader: Actor) -> str | None:
    """Return in words why this person may not countersign this sheet, or None where she may."""
    if not reader.may(Act.COUNTERSIGN):
        return f"To countersign you need the role {' or '.join(holders(Act.COUNTERSIGN))}."
    return countersign_refusal(facts, reader.person_id)


def _waiting(facts: SheetFacts, reader: Actor, now: datetime) -> QueueLine:
    since = facts.handed_in_at or now
    line = _line(
        facts,
        waiting=f"waits {span_words(now - since)}",
        refused=countersign_problem(facts, reader),
    )
    if reader.may(Act.COUNTERSIGN):
        return line
    # a number that is not certified stands on its own sheet only
    url = line.url if may_read_number(reader, facts.state) else f"/bench/{facts.id}"
    return replace(line, reported="", stands_out=(), url=url)


def _done(facts: SheetFacts) -> QueueLine:
    second, at = countersignature(facts), facts.countersigned_at
    by = f" by {second.printed_name}" if second else ""
    when = moment_words(at, facts.laboratory.zone) if at else ""
    return _line(facts, waiting=f"countersigned {when}{by}", refused=None)


def _line(facts: SheetFacts, *, waiting: str, refused: str | None) -> QueueLine:
    measured, evaluation = facts.measured_signature, facts.evaluation
    findings = evaluation.result["findings"] if evaluation else []
    odd = [one for one in findings if one["verdict"] != "holds"]
    return QueueLine(
        sheet_id=facts.id,
        number=facts.number,
        title=sheet_title(facts.lot.titrant, facts.lot.nominal),
        lot_name=facts.lot.name,
        handed_in_by=measured.printed_name if measured else "",
        waiting=waiting,
        reported=evaluation.result["concentration"]["reported"] if evaluation else "",
        stands_out=signed_findings(facts, odd),
        refused=refused,
        url=f"/countersign/{facts.id}",
        notes=_notes(facts),
    )


def _notes(facts: SheetFacts) -> str:
    """Return in a line what was corrected, came late, or was sent back before."""
    late = sum(one.late for one in facts.entries)
    told = [
        (len(strikes(facts.entries)), "entry struck through", "entries struck through"),
        (late, "late entry", "late entries"),
        (len(facts.overrides), "thing used out of date", "things used out of date"),
        (len(facts.returns), "time sent back", "times sent back"),
    ]
    return ", ".join(count_words(count, one, many) for count, one, many in told if count)
