"""Passwords: signing in and proving a signature, in three beats with nothing open meanwhile."""

from typing import Any

from server.credentials.passwords import hash_password, verify_password
from server.lab.actor import Proof
from server.lab.refusal import NotSignedIn
from server.procedures.sign_in import (
    SignedIn,
    find_account,
    find_own_account,
    record_proof,
    record_sign_in,
    sign_out,
)
from server.web.visits import Visit


def sign_in(visit: Visit, name: str, password: str) -> SignedIn:
    """Begin a session; the one that this browser had ends.

    Raises:
        NotSignedIn: name and password do not match; the words are the same for an unknown name.
        TooOften: too many failures of this account or from this source.
    """
    parts = visit.parts
    check = parts.transactions.read(
        lambda session: find_account(session, name, source=visit.source, now=visit.now)
    )
    check.refuse_if_early()
    holds = verify_password(check.password_hash, password)
    new_hash = hash_password(password) if holds and check.needs_rehash else None

    def work(session: Any) -> SignedIn | None:
        now = parts.clock()
        signed = record_sign_in(
            session, check, holds=holds, source=visit.source, now=now, new_hash=new_hash
        )
        if signed is not None and visit.token is not None:
            sign_out(session, visit.token, now=now)
        return signed

    signed = parts.transactions.write(work)
    if signed is None:
        raise NotSignedIn("This name and password do not match.", field="password")
    return signed


def prove(visit: Visit, password: str, *, field: str = "password") -> Proof:
    """Return the proof that who is here gave her own password just now.

    Raises:
        NotSignedIn: it does not match.
        TooOften: too many failures of this account or from this source.
    """
    actor, parts = visit.person, visit.parts
    check = parts.transactions.read(
        lambda session: find_own_account(session, actor, source=visit.source, now=visit.now)
    )
    check.refuse_if_early()
    holds = bool(password) and verify_password(check.password_hash, password)
    proof = parts.transactions.write(
        lambda session: record_proof(
            session, actor, holds=holds, source=visit.source, now=parts.clock()
        )
    )
    if proof is None:
        raise NotSignedIn("This is not your password; nothing was done.", field=field)
    return proof
