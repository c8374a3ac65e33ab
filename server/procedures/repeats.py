"""A repeated request gets the first answer and does nothing twice."""

from collections.abc import Callable
from datetime import datetime
from typing import Any

from sqlalchemy.orm import Session

from server.lab.actor import Actor
from server.lab.canonical import canonical, digest
from server.lab.refusal import KeyMissing, Unacceptable
from server.records.tables.people import IdempotencyKey

_MOST_KEY = 100


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
    asked = digest(canonical(body))
    row = session.get(IdempotencyKey, (actor.person_id, key))
    if row is not None:
        if row.body_digest != asked:
            says = "This key was sent before with something else in it; nothing was done now."
            raise Unacceptable(says, field="key")
        return row.answer
    answer = work()
    session.add(
        IdempotencyKey(person_id=actor.person_id, key=key, body_digest=asked, answer=answer, at=now)
    )
    session.flush()
    return answer
