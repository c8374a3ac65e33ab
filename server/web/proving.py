"""Passwords: signing in and proving a signature, in three beats with nothing open meanwhile."""

from typing import Any

from server.credentials.passwords import hash_password, verify_password
from server.lab.actor import Proof
from server.lab.people import sign_in_key
from server.lab.refusal import NotSignedIn
from server.procedures.sign_in import (
    SignedIn,
    find_account,
    find_own_account,
    is_first_signing,
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


def asks_name(visit: Visit) -> bool:
    """Say whether the next signature takes name and password: the first one of a session does."""
    actor = visit.actor
    return actor is not None and visit.parts.transactions.read(
        lambda session: is_first_signing(session, actor.person_id, token=visit.token)
    )


def prove_to_sign(visit: Visit, name: str, password: str) -> Proof:
    """Return the proof for a signature; the first one of a session needs the name as well.

    Raises:
        NotSignedIn: the name is missing, or name and password do not match.
        TooOften: too many failures of this account or from this source.
    """
    if not name.strip() and asks_name(visit):
        says = (
            "This is your first signature since you signed in: give your sign-in name with your "
            "password."
        )
        raise NotSignedIn(says, field="name")
    return prove(visit, password, name=name)


def prove(visit: Visit, password: str, *, field: str = "password", name: str = "") -> Proof:
    """Return the proof that who is here gave her own password just now, and name where she gave it.

    Raises:
        NotSignedIn: it does not match.
        TooOften: too many failures of this account or from this source.
    """
    actor, parts = visit.person, visit.parts
    check = parts.transactions.read(
        lambda session: find_own_account(session, actor, source=visit.source, now=visit.now)
    )
    check.refuse_if_early()
    own_name = not name.strip() or sign_in_key(name) == check.sign_in_name
    holds = bool(password) and own_name and verify_password(check.password_hash, password)
    proof = parts.transactions.write(
        lambda session: record_proof(
            session, actor, holds=holds, source=visit.source, now=parts.clock()
        )
    )
    if proof is None:
        what = "name and password do not match" if name.strip() else "is not your password"
        raise NotSignedIn(f"This {what}; nothing was done.", field=field)
    return proof
