"""Originals that were kept, with and without their bytes."""

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from datetime import datetime

from sqlalchemy import func, select
from sqlalchemy.orm import Session

from server.records.tables.people import Person
from server.records.tables.stores import File
from server.records.trail import fetched


@dataclass(frozen=True, slots=True)
class FileFact:
    """An original without its bytes: name, kind, size in bytes, SHA-256, who kept it and when."""

    id: str
    name: str
    media_type: str
    size: int
    sha256: str
    kept_by: str
    kept_at: datetime


def file_fact(session: Session, file_id: str | None) -> FileFact | None:
    """Return an original without its bytes, or None where there is none."""
    return None if file_id is None else file_facts(session, [file_id]).get(file_id)


def file_facts(session: Session, file_ids: Sequence[str]) -> dict[str, FileFact]:
    """Return originals without their bytes, by id."""
    asked = (
        select(
            File.id, File.name, File.media_type, func.length(File.content), File.sha256,
            Person.printed_name, File.made_at,
        )
        .join(Person, Person.id == File.made_by)
        .where(File.id.in_(file_ids))
    )  # fmt: skip
    return {row[0]: FileFact(*row) for row in session.execute(asked)}


def kept_originals(session: Session) -> Iterator[tuple[str, str, bytes]]:
    """Yield name, SHA-256 and bytes of every original, one of them in memory at a time.

    Raises:
        DoesNotHold: one of them can no longer be read.
    """
    for file_id in list(session.scalars(select(File.id).order_by(File.made_at, File.id))):
        kept = select(File.name, File.sha256, File.content).where(File.id == file_id)
        yield from fetched(session, kept, "A file")
