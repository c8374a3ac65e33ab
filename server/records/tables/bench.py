"""Bench sheets, entries in ink, evaluations, signatures and certificates."""

from sqlalchemy import BigInteger, ForeignKey, Index, Text, UniqueConstraint, text
from sqlalchemy.orm import Mapped, mapped_column

from server.records.tables.base import Document, Table, Uuid, When


class Sheet(Table):
    """A bench sheet; its state is computed from the instants, ``revision`` grows by each act."""

    __tablename__ = "sheet"
    id: Mapped[Uuid] = mapped_column(primary_key=True)
    number: Mapped[str] = mapped_column(Text, unique=True)
    lot_id: Mapped[Uuid] = mapped_column(ForeignKey("lot.id"), index=True)
    recipe_id: Mapped[Uuid] = mapped_column(ForeignKey("recipe.id"))
    standard_lot_id: Mapped[Uuid | None] = mapped_column(ForeignKey("standard_lot.id"))
    calibrations: Mapped[Document]
    overrides: Mapped[Document]
    begun_by: Mapped[Uuid] = mapped_column(ForeignKey("person.id"))
    begun_at: Mapped[When]
    handed_in_at: Mapped[When | None]
    sent_back_at: Mapped[When | None]
    sent_back_remark: Mapped[str | None] = mapped_column(Text)
    countersigned_at: Mapped[When | None]
    abandoned_at: Mapped[When | None]
    evaluation_id: Mapped[Uuid | None]
    revision: Mapped[int] = mapped_column(default=1)


class Entry(Table):
    """One thing written on a bench sheet, in ink: never changed, only struck through.

    ``file_id`` is the original that a curve's points came from.
    """

    __tablename__ = "entry"
    __table_args__ = (
        UniqueConstraint("sheet_id", "position"),
        Index(
            "uq_entry_device_id_device_sequence",
            "device_id",
            "device_sequence",
            unique=True,
            sqlite_where=text("device_id IS NOT NULL"),
            postgresql_where=text("device_id IS NOT NULL"),
        ),
    )
    id: Mapped[Uuid] = mapped_column(primary_key=True)
    sheet_id: Mapped[Uuid] = mapped_column(ForeignKey("sheet.id"), index=True)
    position: Mapped[int]
    replicate: Mapped[int]
    slot: Mapped[str] = mapped_column(Text)
    segment: Mapped[int] = mapped_column(default=1)
    text: Mapped[str] = mapped_column(Text)
    unit: Mapped[str | None] = mapped_column(Text)
    raw: Mapped[str | None] = mapped_column(Text)
    strikes: Mapped[Uuid | None] = mapped_column(ForeignKey("entry.id"))
    reason: Mapped[str | None] = mapped_column(Text)
    person_id: Mapped[Uuid] = mapped_column(ForeignKey("person.id"))
    posted_by: Mapped[Uuid] = mapped_column(ForeignKey("person.id"))
    device_id: Mapped[Uuid | None] = mapped_column(ForeignKey("device.id"))
    device_sequence: Mapped[int | None]
    device_at: Mapped[When | None]
    device_zone: Mapped[str | None] = mapped_column(Text)
    monotonic_ms: Mapped[int | None] = mapped_column(BigInteger)
    received_at: Mapped[When]
    base_revision: Mapped[int | None]
    body_digest: Mapped[str] = mapped_column(Text)
    late: Mapped[bool] = mapped_column(default=False)
    file_id: Mapped[Uuid | None] = mapped_column(ForeignKey("file.id"))


class Evaluation(Table):
    """One evaluation of a sheet: the snapshot that holds its result and replays it."""

    __tablename__ = "evaluation"
    id: Mapped[Uuid] = mapped_column(primary_key=True)
    sheet_id: Mapped[Uuid] = mapped_column(ForeignKey("sheet.id"), index=True)
    calculation: Mapped[str] = mapped_column(Text)
    input_digest: Mapped[str] = mapped_column(Text)
    snapshot: Mapped[str] = mapped_column(Text)
    snapshot_digest: Mapped[str] = mapped_column(Text)
    made_at: Mapped[When]


class Signature(Table):
    """A signature: printed name, time with zone, meaning, bound to a digest of what was signed.

    ``reasons`` maps the name of a failing finding to the analyst's reason (measured), or lists the
    findings accepted by name (countersigned).
    """

    __tablename__ = "signature"
    id: Mapped[Uuid] = mapped_column(primary_key=True)
    sheet_id: Mapped[Uuid] = mapped_column(ForeignKey("sheet.id"), index=True)
    person_id: Mapped[Uuid] = mapped_column(ForeignKey("person.id"))
    printed_name: Mapped[str] = mapped_column(Text)
    meaning: Mapped[str] = mapped_column(Text)
    at: Mapped[When]
    zone: Mapped[str] = mapped_column(Text)
    evaluation_id: Mapped[Uuid] = mapped_column(ForeignKey("evaluation.id"))
    signed_digest: Mapped[str] = mapped_column(Text)
    reasons: Mapped[Document]
    remark: Mapped[str | None] = mapped_column(Text)


class Certificate(Table):
    """The issued statement of a lot's concentration: numbered, never edited, only replaced."""

    __tablename__ = "certificate"
    id: Mapped[Uuid] = mapped_column(primary_key=True)
    number: Mapped[str] = mapped_column(Text, unique=True)
    lot_id: Mapped[Uuid] = mapped_column(ForeignKey("lot.id"), index=True)
    sheet_id: Mapped[Uuid] = mapped_column(ForeignKey("sheet.id"))
    evaluation_id: Mapped[Uuid] = mapped_column(ForeignKey("evaluation.id"))
    replaces_id: Mapped[Uuid | None] = mapped_column(ForeignKey("certificate.id"), unique=True)
    issued_at: Mapped[When]
    valid_until: Mapped[When]
    document: Mapped[str] = mapped_column(Text)
    document_digest: Mapped[str] = mapped_column(Text)
    trail_seq: Mapped[int]
    trail_hash: Mapped[str] = mapped_column(Text)
