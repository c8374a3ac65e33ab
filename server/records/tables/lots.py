"""Titrant lots, their bottles, and what takes a lot out of use."""

from sqlalchemy import ForeignKey, Text, UniqueConstraint
from sqlalchemy.orm import Mapped, mapped_column

from server.records.tables.base import Document, Table, Uuid, When


class Lot(Table):
    """A made-up solution of one preparation. ``code`` is the 8-character code."""

    __tablename__ = "lot"
    id: Mapped[Uuid] = mapped_column(primary_key=True)
    code: Mapped[str] = mapped_column(Text, unique=True)
    name: Mapped[str] = mapped_column(Text, unique=True)
    titrant: Mapped[str] = mapped_column(Text)
    nominal: Mapped[str] = mapped_column(Text)
    medium: Mapped[str] = mapped_column(Text)
    document: Mapped[Document]
    made_by: Mapped[Uuid] = mapped_column(ForeignKey("person.id"))
    made_at: Mapped[When]


class Bottle(Table):
    """One container of a lot. ``opened_until`` is when it is no longer good for being open."""

    __tablename__ = "bottle"
    __table_args__ = (UniqueConstraint("lot_id", "number"),)
    id: Mapped[Uuid] = mapped_column(primary_key=True)
    code: Mapped[str] = mapped_column(Text, unique=True)
    lot_id: Mapped[Uuid] = mapped_column(ForeignKey("lot.id"), index=True)
    number: Mapped[int]
    place: Mapped[str] = mapped_column(Text)
    volume_mL: Mapped[str] = mapped_column(Text)
    filled_by: Mapped[Uuid] = mapped_column(ForeignKey("person.id"))
    filled_at: Mapped[When]
    used_up_at: Mapped[When | None]
    used_up_by: Mapped[Uuid | None] = mapped_column(ForeignKey("person.id"))
    opened_at: Mapped[When | None]
    opened_until: Mapped[When | None]
    opened_by: Mapped[Uuid | None] = mapped_column(ForeignKey("person.id"))


class Pull(Table):
    """A lot taken out of use for good: a keeper proposes, a countersigner confirms."""

    __tablename__ = "pull"
    id: Mapped[Uuid] = mapped_column(primary_key=True)
    lot_id: Mapped[Uuid] = mapped_column(ForeignKey("lot.id"), index=True)
    reason: Mapped[str] = mapped_column(Text)
    proposed_by: Mapped[Uuid] = mapped_column(ForeignKey("person.id"))
    proposed_at: Mapped[When]
    confirmed_by: Mapped[Uuid | None] = mapped_column(ForeignKey("person.id"))
    confirmed_at: Mapped[When | None]
