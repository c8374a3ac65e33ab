"""The trail: append-only and chained; triggers refuse update and delete."""

from sqlalchemy import BigInteger, Text
from sqlalchemy.orm import Mapped, mapped_column

from server.records.tables.base import Table, Uuid, When


class TrailRow(Table):
    """One act: who, what, when, why; ``hash`` chains it to the row before."""

    __tablename__ = "trail"
    seq: Mapped[int] = mapped_column(BigInteger, primary_key=True, autoincrement=False)
    at: Mapped[When]
    zone: Mapped[str] = mapped_column(Text)
    person_id: Mapped[Uuid | None]
    person_name: Mapped[str] = mapped_column(Text)
    act: Mapped[str] = mapped_column(Text)
    kind: Mapped[str] = mapped_column(Text)
    thing_id: Mapped[Uuid] = mapped_column(index=True)
    thing_name: Mapped[str] = mapped_column(Text)
    why: Mapped[str | None] = mapped_column(Text)
    body: Mapped[str] = mapped_column(Text)
    previous_hash: Mapped[str] = mapped_column(Text)
    hash: Mapped[str] = mapped_column(Text, unique=True)


class TrailHead(Table):
    """The last row's number and hash: one row, locked last in a transaction."""

    __tablename__ = "trail_head"
    id: Mapped[int] = mapped_column(primary_key=True, autoincrement=False)
    seq: Mapped[int] = mapped_column(BigInteger)
    hash: Mapped[str] = mapped_column(Text)


class Counter(Table):
    """The last number given out of a series (sheets, certificates of a year, lots of a year)."""

    __tablename__ = "counter"
    series: Mapped[str] = mapped_column(Text, primary_key=True)
    last: Mapped[int]
