"""What a number rests on: recipes, standard lots, instruments and their calibrations, files."""

from sqlalchemy import ForeignKey, LargeBinary, Text, UniqueConstraint
from sqlalchemy.orm import Mapped, mapped_column

from server.records.tables.base import Document, Table, Uuid, When


class Recipe(Table):
    """One version of a recipe; versions are never edited, a sheet keeps the one it began with.

    ``id`` names the version; ``name`` with ``version`` is unique. ``document`` is a recipe
    document as ``server.lab.recipe`` reads it.
    """

    __tablename__ = "recipe"
    __table_args__ = (UniqueConstraint("name", "version"),)
    id: Mapped[Uuid] = mapped_column(primary_key=True)
    name: Mapped[str] = mapped_column(Text)
    version: Mapped[int]
    titrant: Mapped[str] = mapped_column(Text)
    standard: Mapped[str] = mapped_column(Text)
    document: Mapped[Document]
    made_by: Mapped[Uuid] = mapped_column(ForeignKey("person.id"))
    made_at: Mapped[When]


class StandardLot(Table):
    """One delivery of a primary standard. ``document`` holds its certificate's statements."""

    __tablename__ = "standard_lot"
    id: Mapped[Uuid] = mapped_column(primary_key=True)
    name: Mapped[str] = mapped_column(Text, unique=True)
    substance: Mapped[str] = mapped_column(Text)
    certificate_number: Mapped[str] = mapped_column(Text)
    issuer: Mapped[str] = mapped_column(Text)
    due_at: Mapped[When]
    due_basis: Mapped[str] = mapped_column(Text)
    document: Mapped[Document]
    file_id: Mapped[Uuid | None] = mapped_column(ForeignKey("file.id"))
    made_by: Mapped[Uuid] = mapped_column(ForeignKey("person.id"))
    made_at: Mapped[When]


class Instrument(Table):
    """A balance, burette, thermometer or room monitor with the rest of its identity."""

    __tablename__ = "instrument"
    id: Mapped[Uuid] = mapped_column(primary_key=True)
    kind: Mapped[str] = mapped_column(Text)
    name: Mapped[str] = mapped_column(Text, unique=True)
    document: Mapped[Document]
    made_by: Mapped[Uuid] = mapped_column(ForeignKey("person.id"))
    made_at: Mapped[When]


class Calibration(Table):
    """One calibration of an instrument; the newest version serves, old ones stay.

    ``run`` is the calibration as it was done here, reading by reading, as typed.
    """

    __tablename__ = "calibration"
    __table_args__ = (UniqueConstraint("instrument_id", "version"),)
    id: Mapped[Uuid] = mapped_column(primary_key=True)
    instrument_id: Mapped[Uuid] = mapped_column(ForeignKey("instrument.id"), index=True)
    version: Mapped[int]
    certificate_number: Mapped[str] = mapped_column(Text)
    issuer: Mapped[str] = mapped_column(Text)
    done_on: Mapped[str] = mapped_column(Text)
    due_at: Mapped[When]
    due_basis: Mapped[str] = mapped_column(Text)
    document: Mapped[Document]
    run: Mapped[Document | None]
    file_id: Mapped[Uuid | None] = mapped_column(ForeignKey("file.id"))
    made_by: Mapped[Uuid] = mapped_column(ForeignKey("person.id"))
    made_at: Mapped[When]


class CurveColumns(Table):
    """Which column of a curve's table holds what, as an instrument's files had it last."""

    __tablename__ = "curve_columns"
    instrument_id: Mapped[Uuid] = mapped_column(ForeignKey("instrument.id"), primary_key=True)
    document: Mapped[Document]
    person_id: Mapped[Uuid] = mapped_column(ForeignKey("person.id"))
    at: Mapped[When]


class Log(Table):
    """One line in the log of a standard lot or instrument: drying, use, opened, check weighing.

    In ink: a line is struck by another one, with a reason.
    """

    __tablename__ = "log"
    id: Mapped[Uuid] = mapped_column(primary_key=True)
    kind: Mapped[str] = mapped_column(Text)
    thing_id: Mapped[Uuid] = mapped_column(index=True)
    what: Mapped[str] = mapped_column(Text)
    document: Mapped[Document]
    strikes: Mapped[Uuid | None] = mapped_column(ForeignKey("log.id"), unique=True)
    reason: Mapped[str | None] = mapped_column(Text)
    person_id: Mapped[Uuid] = mapped_column(ForeignKey("person.id"))
    at: Mapped[When]


class File(Table):
    """An original as bytes, so that backup, move and several hosts carry it."""

    __tablename__ = "file"
    id: Mapped[Uuid] = mapped_column(primary_key=True)
    name: Mapped[str] = mapped_column(Text)
    media_type: Mapped[str] = mapped_column(Text)
    sha256: Mapped[str] = mapped_column(Text)
    content: Mapped[bytes] = mapped_column(LargeBinary)
    made_by: Mapped[Uuid] = mapped_column(ForeignKey("person.id"))
    made_at: Mapped[When]


class Hold(Table):
    """Somebody doubts a thing (``kind``: lot, bottle, standard lot, instrument) until released."""

    __tablename__ = "hold"
    id: Mapped[Uuid] = mapped_column(primary_key=True)
    kind: Mapped[str] = mapped_column(Text)
    thing_id: Mapped[Uuid] = mapped_column(index=True)
    held_by: Mapped[Uuid] = mapped_column(ForeignKey("person.id"))
    held_at: Mapped[When]
    reason: Mapped[str] = mapped_column(Text)
    released_by: Mapped[Uuid | None] = mapped_column(ForeignKey("person.id"))
    released_at: Mapped[When | None]
    release_reason: Mapped[str | None] = mapped_column(Text)
