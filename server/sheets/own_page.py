"""One's own page: the tokens that one's scripts come by."""

from datetime import datetime

from sqlalchemy.orm import Session

from server.lab.actor import Actor
from server.lab.roles import Act
from server.lab.scopes import SAYS, Scope
from server.records.queries.load_tokens import tokens_of
from server.records.tables.shelf import AccessToken
from server.sheets.notices import OwnPage, TokenLine
from server.sheets.parts.doors import need_reader
from server.sheets.parts.telling import last_day_words, moment_words


def open_own_page(session: Session, *, actor: Actor | None, now: datetime) -> OwnPage:
    """Return one's own tokens, made last first, and what a new one may do.

    Raises:
        NotSignedIn: a visitor.
    """
    reader = need_reader(actor)
    offered = [one for one in Scope if one is not Scope.USES or reader.may(Act.USE)]
    return OwnPage(
        tokens=tuple(_line(row, reader.zone, now) for row in tokens_of(session, reader.person_id)),
        scopes=tuple((scope.value, SAYS[scope]) for scope in offered),
    )


def _line(row: AccessToken, zone: str, now: datetime) -> TokenLine:
    holds = row.revoked_at is None and now < row.expires_at
    if row.revoked_at is not None:
        says = f"revoked {moment_words(row.revoked_at, zone)}"
    else:
        says = f"until {moment_words(row.expires_at, zone)}" if holds else "past its last day"
    return TokenLine(
        id=row.id,
        name=row.name,
        scopes=tuple(row.scopes),
        made=moment_words(row.made_at, zone),
        good_until=last_day_words(row.expires_at, zone),
        last_used=moment_words(row.seen_at, zone) if row.seen_at else "never",
        holds=holds,
        says=says,
    )
