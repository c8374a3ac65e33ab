"""Signatures as printed, each checked again against what it was bound to."""

from collections.abc import Mapping

from server.lab.canonical import digest
from server.lab.sheet_facts import SheetFacts
from server.lab.signing import signature_holds
from server.sheets.bench import SignatureView
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
        )
        for one in facts.signatures
    )
