"""A repeated request gets the first answer and does nothing twice."""

from collections.abc import Callable
from dataclasses import dataclass
from datetime import datetime
from typing import Any

from sqlalchemy.orm import Session

from server.lab.actor import Actor
from server.lab.canonical import canonical, digest
from server.lab.refusal import KeyMissing, Unacceptable
from server.records.tables.people import IdempotencyKey

_MOST_KEY = 100


@dataclass(frozen=True, slots=True)
class Answered:
    """The answer that a key got the first time."""

    answer: Any


def once(
    session: Session,
    *,
    actor: Actor,
    key: str | None,
    body: Any,
    now: datetime,
    work: Callable[[], Any],
) -> Any:
    """Return the answer of ``work``, or the first answer where this key came before.

    ``body`` is what was asked, JSON-like: only its digest is kept. ``work`` runs in the same
    transaction as the key's row; its answer is JSON-like.

    Raises:
        KeyMissing: there is no key.
        Unacceptable: the key came before with another body.
    """
    if not key or len(key) > _MOST_KEY:
        says = "This request needs an idempotency key of 1 to 100 characters."
        raise KeyMissing(says, field="key", example="2f1c1f0e-7d0b-4c5e-9d43-0a1b2c3d4e5f")
    earlier = find_answer(session, actor=actor, key=key, body=body)
    if earlier is not None:
        return earlier.answer
    # the key first: a repeat that comes meanwhile waits at it, and then finds the answer
    row = IdempotencyKey(
        person_id=actor.person_id, key=key, body_digest=_digest(body), answer={}, at=now
    )
    session.add(row)
    session.flush()
    row.answer = work()
    session.flush()
    return row.answer


def find_answer(session: Session, *, actor: Actor, key: str, body: Any) -> Answered | None:
    """Return the first answer where a key came before, or None; writes nothing.

    Raises:
        Unacceptable: the key came before with another body.
    """
    row = session.get(IdempotencyKey, (actor.person_id, key))
    if row is None:
        return None
    if row.body_digest != _digest(body):
        says = "This key was sent before with something else in it; nothing was done now."
        raise Unacceptable(says, field="key")
    return Answered(row.answer)


def _digest(body: Any) -> str:
    return digest(canonical(body))
