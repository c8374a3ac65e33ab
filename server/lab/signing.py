"""What a signature is bound to: a digest that belongs to one record and no other."""

from collections.abc import Mapping, Sequence
from typing import Any, Protocol

from server.lab.canonical import canonical, digest
from server.lab.ink import WrittenEntry, ink_digest
from server.lab.sheet_facts import SignatureFact

MEASURED, COUNTERSIGNED = "measured", "countersigned"


class Inked(Protocol):
    """What a signature is set under: a sheet's id and all that was written on it."""

    @property
    def id(self) -> str:
        """The sheet's id."""

    @property
    def entries(self) -> Sequence[WrittenEntry]:
        """What was written, struck through or not."""


def digest_to_sign(signature: SignatureFact, facts: Inked, snapshot_digest: str) -> str:
    """Return the digest of who signs what, when and in which meaning, with all that was written.

    Entries received after the signature do not belong to it; the signature's own digest does not
    enter.
    """
    ink = ink_digest(entry for entry in facts.entries if entry.received_at <= signature.at)
    return digest(
        canonical(
            {
                "sheet": facts.id,
                "snapshot": snapshot_digest,
                "ink": ink,
                "person": signature.person_id,
                "printed_name": signature.printed_name,
                "meaning": signature.meaning,
                "at": signature.at.isoformat(),
                "zone": signature.zone,
                "reasons": signature.reasons,
                "remark": signature.remark,
            }
        )
    )


def signature_holds(signature: SignatureFact, facts: Inked, snapshot_digest: str) -> bool:
    """Say whether a signature still belongs to this sheet, this evaluation and what is written."""
    return signature.signed_digest == digest_to_sign(signature, facts, snapshot_digest)


def countersign_reasons(accepted: Sequence[str], trail_seen: int) -> dict[str, Any]:
    """Return what a countersignature notes: the findings accepted by name, the trail's last act."""
    return {"accepted": list(accepted), "trail_seen": trail_seen}


def accepted_findings(signature: SignatureFact) -> tuple[str, ...]:
    """Return the findings that a countersignature accepts; earlier releases kept the list alone."""
    reasons = signature.reasons
    return tuple(reasons.get("accepted", ()) if isinstance(reasons, Mapping) else reasons)


def trail_seen(signature: SignatureFact) -> int | None:
    """Return up to which act the countersigner had read the sheet's trail; None if not noted."""
    reasons = signature.reasons
    if signature.meaning != COUNTERSIGNED or not isinstance(reasons, Mapping):
        return None
    return reasons.get("trail_seen")
