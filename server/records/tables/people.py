"""People, their sessions, devices and failed sign-ins; the laboratory itself."""

from sqlalchemy import ForeignKey, Text
from sqlalchemy.orm import Mapped, mapped_column

from server.records.tables.base import Document, Table, Uuid, When


class Laboratory(Table):
    """The laboratory: one row. ``settings`` holds limits, ``shelf_open``, ``own_signature``."""

    __tablename__ = "laboratory"
    id: Mapped[int] = mapped_column(primary_key=True)
    name: Mapped[str] = mapped_column(Text)
    address: Mapped[str] = mapped_column(Text)
    zone: Mapped[str] = mapped_column(Text)
    settings: Mapped[Document]
    own_signature: Mapped[bool] = mapped_column(default=False)
    revision: Mapped[int] = mapped_column(default=1)


class Person(Table):
    """A person: one account, never reused. ``roles`` is a sorted list of role words."""

    __tablename__ = "person"
    id: Mapped[Uuid] = mapped_column(primary_key=True)
    sign_in_name: Mapped[str] = mapped_column(Text, unique=True)
    printed_name: Mapped[str] = mapped_column(Text)
    initials: Mapped[str] = mapped_column(Text)
    password_hash: Mapped[str] = mapped_column(Text)
    roles: Mapped[Document]
    active: Mapped[bool] = mapped_column(default=True)
    made_at: Mapped[When]
    revision: Mapped[int] = mapped_column(default=1)


class SignIn(Table):
    """A server-side session; the cookie holds the token, the row its SHA-256."""

    __tablename__ = "sign_in"
    token_digest: Mapped[str] = mapped_column(Text, primary_key=True)
    person_id: Mapped[Uuid] = mapped_column(ForeignKey("person.id"))
    form_token: Mapped[str] = mapped_column(Text)
    began_at: Mapped[When]
    seen_at: Mapped[When]
    ended_at: Mapped[When | None]


class SignInFailure(Table):
    """Failures in a row for one account or one source; ``key`` is ``account:…`` or ``source:…``."""

    __tablename__ = "sign_in_failure"
    key: Mapped[str] = mapped_column(Text, primary_key=True)
    count: Mapped[int]
    last_at: Mapped[When]


class Device(Table):
    """A tablet or browser that writes entries; its sequence is its own."""

    __tablename__ = "device"
    id: Mapped[Uuid] = mapped_column(primary_key=True)
    name: Mapped[str] = mapped_column(Text)
    first_seen_at: Mapped[When]


class IdempotencyKey(Table):
    """A key that a writer sent, the digest of what came with it, and the first answer."""

    __tablename__ = "idempotency_key"
    person_id: Mapped[Uuid] = mapped_column(ForeignKey("person.id"), primary_key=True)
    key: Mapped[str] = mapped_column(Text, primary_key=True)
    body_digest: Mapped[str] = mapped_column(Text)
    answer: Mapped[Document]
    at: Mapped[When]
