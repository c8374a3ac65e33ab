"""Signatures as printed, each checked again against what it was bound to."""

from collections.abc import Iterable, Mapping
from typing import Any

from server.lab.canonical import digest
from server.lab.sheet_facts import SheetFacts, SignatureFact
from server.lab.signing import COUNTERSIGNED, accepted_findings, signature_holds, trail_seen
from server.sheets.bench import FindingView, SignatureView
from server.sheets.parts.outcome import finding_views
from server.sheets.parts.telling import signed_words


def signature_views(facts: SheetFacts, snapshots: Mapping[str, str]) -> tuple[SignatureView, ...]:
    """Return a sheet's signatures, oldest first.

    ``snapshots`` maps evaluations to their kept text; its digest is made anew, so that a
    signature holds only while text, entries and signature are those that were signed.
    """
    return tuple(
        SignatureView(
            printed_name=one.printed_name,
            meaning=one.meaning,
            at=one.at.isoformat(),
            says_at=signed_words(one.at, one.zone),
            digest=one.signed_digest,
            holds=signature_holds(one, facts, digest(snapshots.get(one.evaluation_id, ""))),
            remark=one.remark,
            trail_seen=trail_seen(one),
        )
        for one in facts.signatures
    )


def signed_findings(
    facts: SheetFacts, findings: Iterable[Mapping[str, Any]]
) -> tuple[FindingView, ...]:
    """Return findings with the analyst's reasons, and who accepted them by name."""
    measured, second = facts.measured_signature, countersignature(facts)
    return finding_views(
        findings,
        reasons=measured.reasons if measured else {},
        accepted=accepted_findings(second) if second else (),
        accepted_by=second.printed_name if second else None,
    )


def countersignature(facts: SheetFacts) -> SignatureFact | None:
    """Return the signature that certified a sheet, or None."""
    found = [one for one in facts.signatures if one.meaning == COUNTERSIGNED]
    return found[-1] if found else None
