"""Tokens for scripts: made by a person for herself, shown once, revoked at any time."""

from dataclasses import dataclass
from datetime import datetime, timedelta
from uuid import uuid4

from sqlalchemy.orm import Session

from server.credentials.tokens import new_token, token_digest
from server.lab.actor import Actor, Proof
from server.lab.people import check_name
from server.lab.refusal import NotAllowed, NotFound
from server.lab.scopes import Scope, read_days, read_scopes
from server.procedures.acts import Thing, note_act
from server.records.queries.load_tokens import count_standing_tokens, token_by_digest
from server.records.queries.loading import laboratory_row
from server.records.tables.people import Person
from server.records.tables.shelf import AccessToken

#: What every token begins with, so that one that strayed is recognised.
PREFIX = "tl_"
MOST_TOKENS = 50
_SEEN_EVERY = timedelta(minutes=10)


@dataclass(frozen=True, slots=True)
class MakeToken:
    """A token: what it is for, what it may do, for how many days."""

    name: str
    scopes: tuple[str, ...]
    days: int = 90


@dataclass(frozen=True, slots=True)
class RevokeToken:
    """A token that is to end at once."""

    token_id: str


@dataclass(frozen=True, slots=True)
class TokenView:
    """A token that holds: whose it is and what it may do. ``to_touch``: note it as seen."""

    token_id: str
    actor: Actor
    scopes: frozenset[Scope]
    to_touch: bool


def draw_token() -> str:
    """Return a new token: its prefix and 256 random bits."""
    return PREFIX + new_token()


def make_token(
    session: Session, command: MakeToken, *, digest: str, actor: Actor, proof: Proof, now: datetime
) -> dict[str, str]:
    """Keep the digest of a new token; return its id and that digest.

    Raises:
        NotAllowed: the proof is another person's, or she has too many tokens.
    """
    if proof.person_id != actor.person_id:
        raise NotAllowed("A token is made with one's own password.")
    name = check_name(command.name, "name", example="LIMS export")
    scopes, days = read_scopes(command.scopes, actor), read_days(command.days)
    session.get_one(Person, actor.person_id, with_for_update=True)
    if count_standing_tokens(session, actor.person_id) >= MOST_TOKENS:
        raise NotAllowed(f"You have {MOST_TOKENS} tokens already; revoke one first.")
    row = AccessToken(
        id=str(uuid4()),
        person_id=actor.person_id,
        name=name,
        digest=digest,
        scopes=[scope.value for scope in scopes],
        made_at=now,
        expires_at=now + timedelta(days=days),
    )
    session.add(row)
    session.flush()
    body = {"scopes": row.scopes, "expires_at": row.expires_at.isoformat()}
    note_act(session, "made a token", _thing(row), actor=actor, now=now, body=body)
    return {"id": row.id, "digest": digest}


def revoke_token(session: Session, command: RevokeToken, *, actor: Actor, now: datetime) -> None:
    """End one of one's own tokens for good; doing it twice changes nothing."""
    row = session.get(AccessToken, command.token_id, with_for_update=True)
    if row is None or row.person_id != actor.person_id:
        raise NotFound("You have no such token.", field="token_id")
    if row.revoked_at is not None:
        return
    row.revoked_at, row.revoked_by = now, actor.person_id
    session.flush()
    note_act(session, "revoked a token", _thing(row), actor=actor, now=now)


def find_token(session: Session, token: str, *, now: datetime) -> TokenView | None:
    """Return what a token may do for whom; None where it is unknown, revoked or past its day."""
    found = token_by_digest(session, token_digest(token))
    if found is None:
        return None
    row, person = found
    if row.revoked_at is not None or now >= row.expires_at or not person.active:
        return None
    actor = Actor(
        person_id=person.id,
        printed_name=person.printed_name,
        initials=person.initials,
        roles=frozenset(person.roles),
        zone=laboratory_row(session).zone,
    )
    seen = row.seen_at
    return TokenView(
        token_id=row.id,
        actor=actor,
        scopes=frozenset(Scope(word) for word in row.scopes),
        to_touch=seen is None or now - seen >= _SEEN_EVERY,
    )


def record_token_seen(session: Session, token_id: str, *, now: datetime) -> None:
    """Write down that a token was used."""
    row = session.get(AccessToken, token_id)
    if row is not None and (row.seen_at is None or row.seen_at < now):
        row.seen_at = now
        session.flush()


def _thing(row: AccessToken) -> Thing:
    return Thing("token", row.id, row.name)
