"""Everything on one page before the signature *measured*."""

from collections.abc import Mapping
from dataclasses import dataclass
from datetime import datetime
from typing import Any

from sqlalchemy.orm import Session

from server.evaluation.from_sheet import PreparedSheet, evaluate_sheet, prepare_sheet
from server.lab.actor import Actor
from server.lab.refusal import Unacceptable
from server.lab.roles import Act
from server.lab.sheet_facts import SheetFacts
from server.lab.states import OPEN, SENT_BACK
from server.records.queries.list_sheets import snapshots_of
from server.records.queries.load_sheet import load_sheet_facts
from server.sheets.bench import BenchSheet, HandInPage
from server.sheets.bench_sheet import bench_sheet
from server.sheets.parts.curve_views import curve_views
from server.sheets.parts.doors import need_reader
from server.sheets.parts.outcome import dots, finding_views, printed


@dataclass(frozen=True, slots=True)
class ReadHandIn:
    """A sheet read for its hand-in page, not evaluated yet."""

    facts: SheetFacts
    sheet: BenchSheet
    prepared: PreparedSheet
    given: Mapping[str, str]
    problem: str | None
    signer: str


def read_hand_in(
    session: Session, sheet_id: str, *, actor: Actor | None, now: datetime
) -> ReadHandIn:
    """Return what the hand-in page is made of; close the transaction before evaluating it.

    Raises:
        NotFound: there is no such sheet.
        NotSignedIn: a visitor.
        NotAllowed: somebody who may not hand in.
    """
    del now
    reader = need_reader(actor)
    reader.need(Act.HAND_IN)
    facts = load_sheet_facts(session, sheet_id)
    prepared = prepare_sheet(facts)
    sheet = bench_sheet(facts, prepared, snapshots_of(session, facts.id), reader)
    problem = _problem(facts, sheet)
    return ReadHandIn(facts, sheet, prepared, _given(facts), problem, reader.printed_name)


def evaluate_hand_in(read: ReadHandIn) -> HandInPage:
    """Return the page with the evaluation that handing in makes, Monte Carlo included.

    So what is read here is what is signed. What can never be handed in is not evaluated.
    """
    result, problem = _evaluated(read)
    return HandInPage(
        sheet=read.sheet,
        reported=result["concentration"]["reported"] if result else None,
        factor=printed(result).factor if result else None,
        findings=finding_views(result["findings"], reasons=read.given) if result else (),
        dots=dots(result) if result else "",
        problem=read.problem or problem,
        signer=read.signer,
        curves=curve_views(read.facts),
    )


def _evaluated(read: ReadHandIn) -> tuple[Mapping[str, Any] | None, str | None]:
    """Return the result, or in words why there is none."""
    if read.prepared.missing or read.sheet.state not in {OPEN, SENT_BACK}:
        return None, None
    try:
        return evaluate_sheet(read.prepared).result, None
    except Unacceptable as refused:
        return None, refused.says


def _problem(facts: SheetFacts, sheet: BenchSheet) -> str | None:
    if facts.state not in {OPEN, SENT_BACK}:
        return f"This sheet is {facts.state}."
    return sheet.missing[0] if sheet.missing else None


def _given(facts: SheetFacts) -> Mapping[str, str]:
    """Return the reasons of an earlier hand in, so that nobody types them twice."""
    before = facts.measured_signature
    return before.reasons if before is not None and isinstance(before.reasons, Mapping) else {}
