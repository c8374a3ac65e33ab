"""One sheet for the countersigner, in three bands: the number, why, what was written."""

from collections.abc import Iterator, Mapping
from datetime import datetime
from typing import Any

from sqlalchemy.orm import Session

from server.lab.actor import Actor
from server.lab.end_point_taken import valid_for_of
from server.lab.in_use import things_in_use
from server.lab.ink import strikes
from server.lab.refusal import NotAllowed
from server.lab.roles import Act, holders
from server.lab.sheet_facts import EvaluationFact, SheetFacts
from server.lab.states import HANDED_IN, OPEN
from server.records.queries.list_certificates import certificate_of_sheet
from server.records.queries.list_sheets import snapshots_of
from server.records.queries.list_trail import trail_of_sheet
from server.records.queries.load_sheet import load_sheet_facts
from server.sheets.bench import FindingView, SignatureView
from server.sheets.countersign import CountersignPage, Figure
from server.sheets.parts import outcome
from server.sheets.parts.acts import trail_lines
from server.sheets.parts.comparison_view import sheet_comparison
from server.sheets.parts.curve_views import curve_views
from server.sheets.parts.doors import may_read_number, need_reader
from server.sheets.parts.integrity import altered_says
from server.sheets.parts.returned import return_views
from server.sheets.parts.roots import rests_on, root_urls_of_sheet
from server.sheets.parts.rows import groups_of
from server.sheets.parts.sheet_lines import sheet_title
from server.sheets.parts.signed import signature_views, signed_findings
from server.sheets.parts.telling import moment_words
from server.sheets.parts.to_see import things_to_see
from server.sheets.parts.written_when import clocks_off
from server.sheets.queue import countersign_problem

_NOT_AS_SIGNED = (
    "What stands here is not what was handed in: a signature does not match. Nothing can be "
    "certified; tell the steward."
)


def open_countersign(
    session: Session, sheet_id: str, *, actor: Actor | None, now: datetime
) -> CountersignPage:
    """Return a handed-in sheet with all that a second person needs; ``refused`` says why not she.

    Raises:
        NotFound: there is no such sheet.
        NotAllowed: nothing of it is handed in, or its number is not certified yet and not this
            person's to read.
        NotSignedIn: a visitor.
    """
    del now
    reader = need_reader(actor)
    facts = load_sheet_facts(session, sheet_id)
    if not may_read_number(reader, facts.state):
        who = " or ".join(holders(Act.READ_UNCERTIFIED))
        raise NotAllowed(f"This sheet is {facts.state}: only {who} reads its number by now.")
    evaluation = _evaluation(facts)
    result = evaluation.result
    zone = facts.laboratory.zone
    number = outcome.printed(result)
    findings = signed_findings(facts, result["findings"])
    signatures = signature_views(facts, snapshots_of(session, facts.id))
    certificate = certificate_of_sheet(session, facts.id)
    trail = trail_of_sheet(session, facts.id)
    groups = groups_of(facts, clocks_off(trail))
    standing = facts.last_certificate if facts.state == HANDED_IN else None
    return CountersignPage(
        sheet_id=facts.id,
        number=facts.number,
        state=facts.state,
        revision=facts.revision,
        title=sheet_title(facts.lot.titrant, facts.lot.nominal),
        lot_code=facts.lot.code,
        lot_name=facts.lot.name,
        handed_in=_handed_in(facts, zone),
        corrections=len(strikes(facts.entries)),
        value=number.value,
        uncertainty=number.uncertainty,
        beside=number.beside,
        coverage=number.coverage,
        unit=number.unit,
        k=number.k,
        valid_for=valid_for_of(facts.recipe.document, result),
        figures=tuple(_figures(facts, result, findings)),
        findings=findings,
        to_accept=outcome.failing_names(result["findings"]),
        dots=outcome.dots(result),
        dots_says=outcome.dots_says(result),
        budget=outcome.budget_rows(result, root_urls_of_sheet(facts)),
        bars=outcome.bars(result),
        budget_says=outcome.budget_says(result),
        replicates=outcome.replicate_rows(result),
        monte_carlo=outcome.monte_carlo_says(result),
        constants=outcome.constants(result),
        formula=outcome.formula(facts.recipe.document.route),
        calculation=outcome.calculation(result),
        input_digest=evaluation.input_digest,
        methods=sheet_comparison(facts),
        curves=curve_views(facts),
        rests_on=rests_on(facts),
        groups=groups,
        trail=trail_lines(trail, zone),
        signatures=signatures,
        certificate_url=f"/certificates/{certificate.number}" if certificate else None,
        certificate_number=certificate.number if certificate else None,
        refused=_refused(facts, signatures, reader),
        signer=reader.printed_name,
        altered=altered_says(session, facts.id),
        returns=return_views(facts),
        to_see=things_to_see(facts, groups),
        trail_last=max((one.seq for one in trail if one.kind == "sheet"), default=0),
        replaces=standing.number if standing else None,
    )


def _evaluation(facts: SheetFacts) -> EvaluationFact:
    """Return the evaluation that was signed; a sheet taken up again has none that counts."""
    if facts.evaluation is None or facts.state == OPEN:
        says = f"This sheet is {facts.state}: it is not handed in. Read it on the bench."
        raise NotAllowed(says)
    return facts.evaluation


def _handed_in(facts: SheetFacts, zone: str) -> str:
    measured = facts.measured_signature
    if measured is None:
        return ""
    return f"handed in {moment_words(measured.at, zone)} by {measured.printed_name}"


def _refused(facts: SheetFacts, signatures: tuple[SignatureView, ...], reader: Actor) -> str | None:
    """Return in words why this person cannot sign this sheet now, or None where she can."""
    if facts.state != HANDED_IN:
        return f"This sheet is {facts.state}; it does not wait for a second person."
    problem = countersign_problem(facts, reader)
    if problem is not None:
        return problem
    if facts.lot.pulled:
        return "This lot was pulled: it is out of use for good."
    if not all(one.holds for one in signatures):
        return _NOT_AS_SIGNED
    blocking = (one.says for one in things_in_use(facts) if one.blocks)
    return next(blocking, None)


def _figures(
    facts: SheetFacts, result: Mapping[str, Any], findings: tuple[FindingView, ...]
) -> Iterator[Figure]:
    """Yield factor, spread, the last certificate, and what was left out, each with its verdict."""
    by_name = {one.name: one for one in findings}
    number = outcome.printed(result)
    if number.interval:
        says = "Monte Carlo does not validate first order: this interval is the one printed."
        yield Figure("95 % interval", number.interval, says, "look")
    ratio = f"{number.value} ÷ {facts.lot.nominal} {number.unit}"
    factor = ("factor", f"concentration ÷ nominal = {ratio}")
    yield _figure("Factor", number.factor, by_name.get("nominal"), roots=(factor,))
    spread = by_name.get("spread")
    mean = ("relative s", outcome.dots_says(result))
    yield _figure("Spread", spread.figure if spread else "", spread, roots=(mean,))
    last = by_name.get("last certificate")
    if last is None:
        yield Figure("Last certificate", "none", "This is the first one of the lot.", "")
    else:
        yield _figure("Against the last certificate", last.figure, last)
    left_out = by_name.get("excluded")
    if left_out is not None:
        yield _figure("With all replicates", left_out.figure, left_out)
    elif facts.last_certificate is not None:
        was = facts.last_certificate.document["result"]["concentration"]["reported"]
        yield Figure("Last time", was, f"Certificate {facts.last_certificate.number}", "")


def _figure(
    caption: str,
    number: str,
    finding: FindingView | None,
    *,
    roots: tuple[tuple[str, str], ...] = (),
) -> Figure:
    """Return a figure with what it comes from, and the check that judges it."""
    if finding is None:
        return Figure(caption, number, "", "", roots)
    judged = (("figure", finding.figure), ("limit", finding.limit), ("basis", finding.basis))
    lines = (*roots, *(pair for pair in judged if pair[1]))
    return Figure(caption, number, finding.says, finding.verdict, lines)
