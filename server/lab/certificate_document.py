"""The issued statement of a lot's concentration, as one JSON-like document."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from datetime import datetime
from typing import Any

from server.lab.end_point_taken import methods_taken, valid_for_of
from server.lab.in_use import InUse, kind_of_slot
from server.lab.ink import excluded, standing, strikes
from server.lab.rig import rig_of
from server.lab.segregation import own_part
from server.lab.sheet_facts import EvaluationFact, OverrideFact, SheetFacts, SignatureFact
from server.lab.signing import accepted_findings, trail_seen
from server.lab.slots import row_at
from server.lab.validity import ValidUntil, last_day, local_day

FORMAT = "certificate/1"
TITLE = "Titrant standardization certificate (in-house)"
NOT_REVIEWED = "Not independently reviewed: the laboratory allows one person's own signature."


@dataclass(frozen=True, slots=True)
class Issue:
    """What is known only when a certificate is issued; ``because`` says why it replaces one."""

    number: str
    issued_at: datetime
    replaces: str | None
    valid: ValidUntil
    because: str = ""


def build_certificate(
    facts: SheetFacts,
    evaluation: EvaluationFact,
    *,
    issue: Issue,
    in_use: Sequence[InUse],
    measured: SignatureFact,
    countersigned: SignatureFact,
) -> dict[str, Any]:
    """Return the certificate's document.

    Keys: ``format``, ``number``, ``title``, ``replaces``, ``replaces_because``, ``issued_at``,
    ``laboratory``, ``lot``, ``sheet``, ``recipe``, ``result`` (bench result), ``findings`` (with
    ``reason`` and ``accepted_by``), ``valid_for``, ``end_point``, ``validity``, ``measured``,
    ``replicates_left_out``, ``corrections``, ``entries``,
    ``traceability``, ``signatures``, ``independently_reviewed``,
    ``statements``, ``calculation``, ``input_digest``, ``snapshot_digest``. Instants are ISO 8601
    in UTC, days are the laboratory's.
    """
    recipe, result = facts.recipe, evaluation.result
    reviewed = own_part(facts, countersigned.person_id) is None
    return {
        "format": FORMAT,
        "number": issue.number,
        "title": TITLE,
        "replaces": issue.replaces,
        "replaces_because": issue.because if issue.replaces else "",
        "issued_at": issue.issued_at.isoformat(),
        "laboratory": {
            "name": facts.laboratory.name,
            "address": facts.laboratory.address,
            "zone": facts.laboratory.zone,
        },
        "lot": _lot(facts),
        "sheet": {"id": facts.id, "number": facts.number},
        "recipe": {
            "id": recipe.id,
            "name": recipe.name,
            "version": recipe.version,
            "title": recipe.document.title,
        },
        "result": result,
        "findings": _findings(result, measured, countersigned),
        "valid_for": valid_for_of(recipe.document, result),
        "end_point": {
            "mode": recipe.document.end_point.mode,
            "indicator": recipe.document.end_point.indicator,
            "methods": methods_taken(result),
        },
        "validity": {
            "until": issue.valid.at.isoformat(),
            "last_day": last_day(issue.valid.at, facts.laboratory.zone).isoformat(),
            "rule": issue.valid.rule,
            "interval_days": recipe.document.interval_days,
            "notice_days": recipe.document.notice_days,
        },
        "measured": _measured(facts),
        "replicates_left_out": _left_out(facts),
        "corrections": corrections(facts),
        "entries": _entries(facts),
        "traceability": [_root(facts, one) for one in in_use],
        "signatures": [_signature(measured), _signature(countersigned)],
        "independently_reviewed": reviewed,
        "statements": _statements(facts, in_use, reviewed=reviewed),
        "calculation": evaluation.calculation,
        "input_digest": evaluation.input_digest,
        "snapshot_digest": evaluation.snapshot_digest,
    }


def corrections(facts: SheetFacts) -> list[dict[str, Any]]:
    """Return every strike-through: what stood there, what was written, who, when, why."""
    rig, recipe = rig_of(facts.instruments), facts.recipe.document
    return [
        {
            "replicate": one.struck.replicate,
            "slot": one.struck.slot,
            "segment": one.struck.segment,
            "label": row_at(recipe, rig, one.struck.place).label,
            "unit": one.struck.unit,
            "was": one.struck.text,
            "was_by": one.struck.printed_name,
            "was_at": one.struck.received_at.isoformat(),
            "now": one.by.text,
            "by": one.by.printed_name,
            "at": one.by.received_at.isoformat(),
            "reason": one.by.reason,
        }
        for one in strikes(facts.entries)
    ]


def measured_at(facts: SheetFacts) -> datetime:
    """Return when the last reading that stands was written; later remarks do not count."""
    return max(_reading_times(facts), default=facts.begun_at)


def _reading_times(facts: SheetFacts) -> list[datetime]:
    return [one.received_at for one in standing(facts.entries).values() if kind_of_slot(one.slot)]


def _lot(facts: SheetFacts) -> dict[str, Any]:
    lot = facts.lot
    return {
        "id": lot.id,
        "code": lot.code,
        "name": lot.name,
        "titrant": lot.titrant,
        "nominal": lot.nominal,
        "medium": lot.medium,
        "made_by": lot.made_by.printed_name,
        "prepared_on": lot.document.get("prepared_on"),
    }


def _findings(
    result: Mapping[str, Any], measured: SignatureFact, countersigned: SignatureFact
) -> list[dict[str, Any]]:
    accepted = accepted_findings(countersigned)
    return [
        {
            **finding,
            "reason": measured.reasons.get(finding["name"]),
            "accepted_by": countersigned.printed_name if finding["name"] in accepted else None,
        }
        for finding in result["findings"]
    ]


def _measured(facts: SheetFacts) -> dict[str, Any]:
    zone, end = facts.laboratory.zone, measured_at(facts)
    start = min((one.received_at for one in facts.entries), default=facts.begun_at)
    people = dict.fromkeys(one.printed_name for one in facts.entries)
    return {
        "from": start.isoformat(),
        "to": end.isoformat(),
        "day": local_day(end, zone).isoformat(),
        "by": list(people),
    }


def _left_out(facts: SheetFacts) -> list[dict[str, Any]]:
    return [
        {
            "replicate": replicate,
            "criterion": entry.text,
            "reason": entry.reason,
            "by": entry.printed_name,
            "at": entry.received_at.isoformat(),
        }
        for replicate, entry in sorted(excluded(facts.entries).items())
    ]


def _entries(facts: SheetFacts) -> list[dict[str, Any]]:
    rig, recipe = rig_of(facts.instruments), facts.recipe.document
    return [
        {
            "replicate": one.replicate,
            "slot": one.slot,
            "segment": one.segment,
            "label": row_at(recipe, rig, one.place).label,
            "text": one.text,
            "unit": one.unit,
            "reason": one.reason,
            "by": one.printed_name,
            "at": one.received_at.isoformat(),
        }
        for _, one in sorted(standing(facts.entries).items())
    ]


def _root(facts: SheetFacts, one: InUse) -> dict[str, Any]:
    instrument = facts.instrument(one.kind)
    lot = facts.standard_lot
    paper = instrument or lot
    return {
        "kind": one.kind,
        "id": one.thing_id,
        "name": one.name,
        "certificate_number": paper.certificate_number if paper else "",
        "issuer": paper.issuer if paper else "",
        "calibration_id": instrument.calibration_id if instrument else None,
        "version": instrument.version if instrument else None,
        "done_on": instrument.done_on if instrument else None,
        "due_on": last_day(one.due_at, facts.laboratory.zone).isoformat(),
        "due_basis": paper.due_basis if paper else "",
        "statements": dict(paper.document) if paper else {},
        "state": one.state,
        "says": one.says,
        "override": (
            {
                "reason": one.override.reason,
                "by": one.override.by.printed_name,
                "at": one.override.at.isoformat(),
            }
            if one.override
            else None
        ),
    }


def _signature(signature: SignatureFact) -> dict[str, Any]:
    return {
        "id": signature.id,
        "printed_name": signature.printed_name,
        "meaning": signature.meaning,
        "at": signature.at.isoformat(),
        "zone": signature.zone,
        "signed_digest": signature.signed_digest,
        "remark": signature.remark,
        "trail_seen": trail_seen(signature),
    }


def _statements(facts: SheetFacts, in_use: Sequence[InUse], *, reviewed: bool) -> list[str]:
    lines = [
        f"The result relates only to lot {facts.lot.name}.",
        "The concentration is that of the liquid at 20 °C.",
        "To be reproduced only in full.",
    ]
    lines += [_let(one, one.override) for one in in_use if one.override is not None]
    lines = [line for line in lines if line]
    return lines if reviewed else [*lines, NOT_REVIEWED]


def _let(one: InUse, word: OverrideFact) -> str:
    """Return the sentence about a thing let be used; empty where it was valid when it was used."""
    if one.state == "in date" and not one.off_limits:
        return ""
    how = "Used out of date" if one.state != "in date" else "Used after a failed check"
    failed = f" {one.off_limits}" if one.off_limits else ""
    return f"{how} by {word.by.printed_name}'s word: {one.name}.{failed} Reason: {word.reason}."
