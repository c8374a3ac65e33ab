"""A signature needs the signer's own password, given just now."""

from datetime import datetime, timedelta

from server.lab.actor import Actor, Proof
from server.lab.refusal import NotSignedIn

GOOD_FOR = timedelta(minutes=2)


def need_proof(proof: Proof | None, actor: Actor, *, now: datetime) -> None:
    """Refuse a signature whose password was not given by the signer just now."""
    if proof is None or proof.person_id != actor.person_id:
        raise NotSignedIn("Give your password to sign.", field="password")
    if not timedelta() <= now - proof.given_at <= GOOD_FOR:
        raise NotSignedIn("The password was given too long ago; give it again.", field="password")
