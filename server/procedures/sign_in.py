"""Signing in, in three beats, so that no transaction is open while a password is checked."""

from dataclasses import dataclass, field
from datetime import datetime, timedelta
from functools import cache

from sqlalchemy.orm import Session

from server.credentials.passwords import hash_password, needs_rehash
from server.credentials.tokens import new_token, token_digest
from server.lab.actor import Actor, Proof
from server.lab.people import sign_in_key
from server.lab.refusal import NotSignedIn, TooOften
from server.procedures.acts import Thing, note_act
from server.procedures.throttle import (
    ALERT_AT,
    count_failure,
    forget,
    keys_of,
    refuse_if_early,
    too_often_says,
    wait_s,
)
from server.records.queries.load_sign_ins import signed_since
from server.records.queries.loading import laboratory_row, person_by_name
from server.records.tables.people import Person, SignIn
from server.records.trail import note

_SEEN_EVERY = timedelta(minutes=1)


@dataclass(frozen=True, slots=True)
class AccountCheck:
    """What a password is checked against; ``wait_s`` above zero means: not now."""

    person_id: str | None
    sign_in_name: str
    password_hash: str = field(repr=False)
    wait_s: float

    def refuse_if_early(self) -> None:
        """Refuse a try that comes before the wait is over."""
        if self.wait_s > 0:
            raise TooOften(too_often_says(self.wait_s), shown={"retry_after_s": self.wait_s})

    @property
    def needs_rehash(self) -> bool:
        """Whether the hash was made with other parameters than today's."""
        return self.person_id is not None and needs_rehash(self.password_hash)


@dataclass(frozen=True, slots=True)
class SignedIn:
    """A new session: the cookie's token, the token of its forms, who it is."""

    token: str = field(repr=False)
    form_token: str = field(repr=False)
    actor: Actor


@dataclass(frozen=True, slots=True)
class SessionView:
    """A session that holds. ``to_touch``: call ``record_seen`` in a write, it is a while ago."""

    actor: Actor
    form_token: str = field(repr=False)
    to_touch: bool


def find_account(session: Session, name: str, *, source: str, now: datetime) -> AccountCheck:
    """Return what to check a password against; unknown names get a hash that nothing matches."""
    key = sign_in_key(name)
    person = person_by_name(session, key)
    usable = person is not None and person.active
    return AccountCheck(
        person_id=person.id if person is not None and usable else None,
        sign_in_name=key,
        password_hash=person.password_hash if person is not None and usable else _dummy_hash(),
        wait_s=wait_s(session, keys_of(key, source), now=now),
    )


def record_sign_in(
    session: Session,
    check: AccountCheck,
    *,
    holds: bool,
    source: str,
    now: datetime,
    new_hash: str | None = None,
) -> SignedIn | None:
    """Begin a session where the password held; count the failure and return None where not.

    ``new_hash`` replaces the stored hash after its parameters changed.

    Raises:
        TooOften: others failed at the same time; nothing is checked until the wait is over.
    """
    keys = keys_of(check.sign_in_name, source)
    refuse_if_early(session, keys, now=now)
    person = session.get(Person, check.person_id) if check.person_id else None
    if not holds or person is None or not person.active:
        _note_failure(session, person, count_failure(session, keys, now=now), now=now)
        return None
    forget(session, keys[0])
    if new_hash is not None:
        person.password_hash = new_hash
    token, form_token = new_token(), new_token()
    session.add(
        SignIn(
            token_digest=token_digest(token),
            person_id=person.id,
            form_token=form_token,
            began_at=now,
            seen_at=now,
        )
    )
    session.flush()
    actor = _actor(session, person)
    note_act(session, "signed in", _thing(person), actor=actor, now=now)
    return SignedIn(token, form_token, actor)


def find_actor(session: Session, token: str, *, now: datetime) -> SessionView | None:
    """Return who a session's token belongs to, or None where it does not hold any more."""
    row = session.get(SignIn, token_digest(token))
    if row is None or row.ended_at is not None:
        return None
    settings = laboratory_row(session).settings
    idle = timedelta(minutes=settings.get("idle_minutes", 30))
    longest = timedelta(hours=settings.get("absolute_hours", 12))
    if now - row.seen_at >= idle or now - row.began_at >= longest:
        return None
    person = session.get(Person, row.person_id)
    if person is None or not person.active:
        return None
    return SessionView(
        actor=_actor(session, person),
        form_token=row.form_token,
        to_touch=now - row.seen_at >= _SEEN_EVERY,
    )


def record_seen(session: Session, token: str, *, now: datetime) -> None:
    """Write down that a session was used, so that it is not idle."""
    row = session.get(SignIn, token_digest(token))
    if row is not None and row.ended_at is None and row.seen_at < now:
        row.seen_at = now
        session.flush()


def sign_out(session: Session, token: str, *, now: datetime) -> None:
    """End a session."""
    row = session.get(SignIn, token_digest(token))
    if row is None or row.ended_at is not None:
        return
    row.ended_at = now
    session.flush()
    person = session.get_one(Person, row.person_id)
    note_act(session, "signed out", _thing(person), actor=_actor(session, person), now=now)


def is_first_signing(session: Session, person_id: str, *, token: str | None) -> bool:
    """Say whether this person has signed nothing yet since this session began (21 CFR 11.200)."""
    row = session.get(SignIn, token_digest(token)) if token else None
    return row is None or not signed_since(session, person_id, row.began_at)


def find_own_account(session: Session, actor: Actor, *, source: str, now: datetime) -> AccountCheck:
    """Return what the password for a signature is checked against."""
    person = session.get(Person, actor.person_id)
    if person is None or not person.active:
        raise NotSignedIn("This account is closed.")
    return find_account(session, person.sign_in_name, source=source, now=now)


def record_proof(
    session: Session, actor: Actor, *, holds: bool, source: str, now: datetime
) -> Proof | None:
    """Return the proof for one signature; count the failure and return None where it fails."""
    person = session.get_one(Person, actor.person_id)
    keys = keys_of(person.sign_in_name, source)
    refuse_if_early(session, keys, now=now)
    if not holds or not person.active:
        _note_failure(session, person, count_failure(session, keys, now=now), now=now)
        return None
    forget(session, keys[0])
    return Proof(person_id=person.id, given_at=now)


def _note_failure(session: Session, person: Person | None, count: int, *, now: datetime) -> None:
    """Note repeated failures of a known account: somebody may be trying a password out."""
    if person is None or count % ALERT_AT:
        return
    note(
        session,
        actor=None,
        act="failed to sign in repeatedly",
        kind="person",
        thing_id=person.id,
        thing_name=person.printed_name,
        why=None,
        body={"failures": count},
        now=now,
        zone=laboratory_row(session).zone,
    )


def _actor(session: Session, person: Person) -> Actor:
    return Actor(
        person_id=person.id,
        printed_name=person.printed_name,
        initials=person.initials,
        roles=frozenset(person.roles),
        zone=laboratory_row(session).zone,
    )


def _thing(person: Person) -> Thing:
    return Thing("person", person.id, person.printed_name)


@cache
def _dummy_hash() -> str:
    """Return a hash whose password nobody knows, so that unknown names take the same time."""
    return hash_password(new_token())
