"""What happens around the shelf: uses of bottles, tokens of scripts, watches and their letters."""

from sqlalchemy import ForeignKey, Index, Text, UniqueConstraint, text
from sqlalchemy.orm import Mapped, mapped_column

from server.records.tables.base import Document, Table, Uuid, When

_STANDS = text("ended_at IS NULL")


class AccessToken(Table):
    """A person's token for scripts; the token itself is kept nowhere, the row its SHA-256."""

    __tablename__ = "access_token"
    id: Mapped[Uuid] = mapped_column(primary_key=True)
    person_id: Mapped[Uuid] = mapped_column(ForeignKey("person.id"), index=True)
    name: Mapped[str] = mapped_column(Text)
    digest: Mapped[str] = mapped_column(Text, unique=True)
    scopes: Mapped[Document]
    made_at: Mapped[When]
    expires_at: Mapped[When]
    revoked_at: Mapped[When | None]
    revoked_by: Mapped[Uuid | None] = mapped_column(ForeignKey("person.id"))
    seen_at: Mapped[When | None]


class BottleUse(Table):
    """What a bottle was used for, in ink; ``strikes`` is the line that this one strikes through."""

    __tablename__ = "bottle_use"
    id: Mapped[Uuid] = mapped_column(primary_key=True)
    bottle_id: Mapped[Uuid] = mapped_column(ForeignKey("bottle.id"), index=True)
    result_id: Mapped[str] = mapped_column(Text)
    certificate_number: Mapped[str] = mapped_column(Text)
    used_at: Mapped[When]
    says: Mapped[str] = mapped_column(Text)
    strikes: Mapped[Uuid | None] = mapped_column(ForeignKey("bottle_use.id"), unique=True)
    reason: Mapped[str | None] = mapped_column(Text)
    person_id: Mapped[Uuid] = mapped_column(ForeignKey("person.id"))
    token_id: Mapped[Uuid | None] = mapped_column(ForeignKey("access_token.id"))
    at: Mapped[When]


class Watch(Table):
    """Somebody's wish to be told when a bottle or lot changes."""

    __tablename__ = "watch"
    __table_args__ = (
        Index(
            "uq_watch_standing",
            "person_id",
            "kind",
            "thing_id",
            unique=True,
            sqlite_where=_STANDS,
            postgresql_where=_STANDS,
        ),
    )
    id: Mapped[Uuid] = mapped_column(primary_key=True)
    person_id: Mapped[Uuid] = mapped_column(ForeignKey("person.id"))
    kind: Mapped[str] = mapped_column(Text)
    thing_id: Mapped[Uuid]
    began_at: Mapped[When]
    ended_at: Mapped[When | None]


class Mailbox(Table):
    """Up to when a person has read notices, and where to send them, empty where nowhere."""

    __tablename__ = "mailbox"
    person_id: Mapped[Uuid] = mapped_column(ForeignKey("person.id"), primary_key=True)
    read_until: Mapped[When | None]
    address: Mapped[str] = mapped_column(Text, default="")
    address_since: Mapped[When | None]


class Letter(Table):
    """A notice that goes out by e-mail: one for each change of a watch."""

    __tablename__ = "letter"
    __table_args__ = (UniqueConstraint("watch_id", "changed_at"),)
    id: Mapped[Uuid] = mapped_column(primary_key=True)
    watch_id: Mapped[Uuid] = mapped_column(ForeignKey("watch.id"))
    changed_at: Mapped[When]
    address: Mapped[str] = mapped_column(Text)
    subject: Mapped[str] = mapped_column(Text)
    body: Mapped[str] = mapped_column(Text)
    next_try_at: Mapped[When]
    tries: Mapped[int] = mapped_column(default=0)
    sent_at: Mapped[When | None]
    problem: Mapped[str | None] = mapped_column(Text)
