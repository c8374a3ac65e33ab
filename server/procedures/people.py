"""People: one account each, never reused."""

from collections.abc import Iterable
from dataclasses import dataclass, field
from datetime import datetime
from uuid import uuid4

from sqlalchemy.orm import Session

from server.credentials.passwords import check_new_password, hash_password
from server.lab.actor import Actor, Proof
from server.lab.free_text import MOST_REASON, read_text
from server.lab.people import check_name, check_roles, initials_of, read_initials, sign_in_key
from server.lab.refusal import NotAllowed, NotFound, SavedFirst, Unacceptable
from server.lab.roles import Act, Role
from server.procedures.acts import Thing, note_act
from server.procedures.proofs import need_proof
from server.records.queries.load_sign_ins import end_sign_ins
from server.records.queries.loading import laboratory_row, other_stewards, person_by_name
from server.records.tables.people import Person


@dataclass(frozen=True, slots=True)
class AddPerson:
    """A new account with its first password."""

    sign_in_name: str
    printed_name: str
    roles: tuple[str, ...]
    password: str = field(repr=False)
    initials: str = ""


@dataclass(frozen=True, slots=True)
class ChangeRoles:
    """The roles that a person shall hold; ``revision`` is the one that was read."""

    person_id: str
    roles: tuple[str, ...]
    revision: int


@dataclass(frozen=True, slots=True)
class CloseAccount:
    """An account that is closed for good; its name is not given out again."""

    person_id: str
    reason: str = ""


@dataclass(frozen=True, slots=True)
class ChangePassword:
    """One's own new password; the old one is proven apart."""

    password: str = field(repr=False)


def hash_new_password(password: str, *, names: Iterable[str]) -> str:
    """Return the hash of a new password after checking it; call it with no transaction open."""
    check_new_password(password, names=tuple(names))
    return hash_password(password)


def add_person(
    session: Session, command: AddPerson, *, password_hash: str, actor: Actor, now: datetime
) -> str:
    """Add a person; return the new id.

    Raises:
        Unacceptable: the sign-in name is taken or was ever given out.
    """
    actor.need(Act.ADMINISTER)
    name = sign_in_key(check_name(command.sign_in_name, "sign_in_name", example="m.lind"))
    if person_by_name(session, name) is not None:
        says = f"The sign-in name “{name}” is given out; names are never reused."
        raise Unacceptable(says, field="sign_in_name", example=f"{name}.2")
    printed = check_name(command.printed_name, "printed_name", example="Maren Lind")
    person = Person(
        id=str(uuid4()),
        sign_in_name=name,
        printed_name=printed,
        initials=read_initials(command.initials) or initials_of(printed),
        password_hash=password_hash,
        roles=list(check_roles(command.roles)),
        made_at=now,
    )
    session.add(person)
    session.flush()
    body = {"sign_in_name": name, "roles": person.roles}
    note_act(session, "added a person", _thing(person), actor=actor, now=now, body=body)
    return person.id


def change_roles(session: Session, command: ChangeRoles, *, actor: Actor, now: datetime) -> int:
    """Change a person's roles; return the new revision.

    Raises:
        SavedFirst: somebody else changed the person since it was read.
        NotAllowed: no steward would be left.
    """
    actor.need(Act.ADMINISTER)
    person = _person(session, command.person_id)
    if person.revision != command.revision:
        says = f"Somebody else changed {person.printed_name} meanwhile; look again."
        raise SavedFirst(says, field="revision", shown={"standing": {"roles": person.roles}})
    roles = check_roles(command.roles)
    if Role.STEWARD in person.roles and Role.STEWARD not in roles:
        _need_another_steward(session, person)
    body = {"before": list(person.roles), "after": list(roles)}
    person.roles = list(roles)
    person.revision += 1
    session.flush()
    note_act(session, "changed roles", _thing(person), actor=actor, now=now, body=body)
    return person.revision


def close_account(session: Session, command: CloseAccount, *, actor: Actor, now: datetime) -> None:
    """Close an account and end its sessions; what the person did keeps her name.

    Raises:
        NotAllowed: it is the last steward's.
    """
    actor.need(Act.ADMINISTER)
    reason = read_text(command.reason, "reason", most=MOST_REASON)
    person = _person(session, command.person_id)
    if Role.STEWARD in person.roles:
        _need_another_steward(session, person)
    if not person.active:
        return
    person.active = False
    person.revision += 1
    end_sign_ins(session, person.id, now=now)
    session.flush()
    note_act(session, "closed an account", _thing(person), actor=actor, now=now, why=reason)


def change_password(
    session: Session,
    command: ChangePassword,
    *,
    password_hash: str,
    actor: Actor,
    proof: Proof,
    now: datetime,
) -> None:
    """Change one's own password after proving the old one; other sessions end."""
    del command
    need_proof(proof, actor, now=now)
    person = _person(session, actor.person_id)
    person.password_hash = password_hash
    person.revision += 1
    end_sign_ins(session, person.id, now=now)
    session.flush()
    note_act(session, "changed the own password", _thing(person), actor=actor, now=now)


def _need_another_steward(session: Session, person: Person) -> None:
    # two stewards who close each other at once wait for one another here
    session.refresh(laboratory_row(session), with_for_update=True)
    if not other_stewards(session, person.id):
        raise NotAllowed("This is the last steward: make another one first.", field="roles")


def _person(session: Session, person_id: str) -> Person:
    person = session.get(Person, person_id, with_for_update=True)
    if person is None:
        raise NotFound("There is no such person.", field="person_id")
    return person


def _thing(person: Person) -> Thing:
    return Thing("person", person.id, person.printed_name)
