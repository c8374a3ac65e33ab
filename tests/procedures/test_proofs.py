from datetime import UTC, datetime, timedelta

import pytest

from server.lab.actor import Actor, Proof
from server.lab.refusal import NotSignedIn
from server.procedures.proofs import need_proof

NOW = datetime(2026, 5, 4, 8, 30, tzinfo=UTC)
ACTOR = Actor("p-1", "Ida Mohnke", "IM", frozenset({"analyst"}), "Europe/Berlin")


@pytest.mark.parametrize("age_s", [0, 1, 120])
def test_proof_given_just_now_by_the_signer_passes(age_s):
    need_proof(Proof("p-1", NOW - timedelta(seconds=age_s)), ACTOR, now=NOW)


@pytest.mark.parametrize(
    "proof",
    [
        None,
        Proof("p-2", NOW),
        Proof("p-1", NOW - timedelta(seconds=121)),
        Proof("p-1", NOW + timedelta(seconds=1)),
    ],
)
def test_proof_absent_foreign_old_or_from_the_future_is_refused(proof):
    with pytest.raises(NotSignedIn) as refused:
        need_proof(proof, ACTOR, now=NOW)
    assert refused.value.field == "password"
