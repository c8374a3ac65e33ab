"""Tokens of scripts, by digest or by person."""

from collections.abc import Sequence

from sqlalchemy import func, select
from sqlalchemy.orm import Session

from server.records.tables.people import Person
from server.records.tables.shelf import AccessToken


def token_by_digest(session: Session, digest: str) -> tuple[AccessToken, Person] | None:
    """Return the token of a digest with its person, whether they hold or not."""
    row = session.execute(
        select(AccessToken, Person)
        .join(Person, Person.id == AccessToken.person_id)
        .where(AccessToken.digest == digest)
    ).first()
    return (row[0], row[1]) if row else None


def tokens_of(session: Session, person_id: str) -> Sequence[AccessToken]:
    """Return a person's tokens, made last first."""
    return session.scalars(
        select(AccessToken)
        .where(AccessToken.person_id == person_id)
        .order_by(AccessToken.made_at.desc(), AccessToken.id)
    ).all()


def count_standing_tokens(session: Session, person_id: str) -> int:
    """Return how many of a person's tokens nobody has revoked."""
    asked = (
        select(func.count())
        .select_from(AccessToken)
        .where(AccessToken.person_id == person_id, AccessToken.revoked_at.is_(None))
    )
    return session.scalar(asked) or 0
