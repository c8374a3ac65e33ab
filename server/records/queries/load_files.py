"""Originals that were kept, with and without their bytes."""

from dataclasses import dataclass
from datetime import datetime

from sqlalchemy import func, select
from sqlalchemy.orm import Session

from server.records.tables.people import Person
from server.records.tables.stores import File


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
    if file_id is None:
        return None
    asked = (
        select(
            File.id, File.name, File.media_type, func.length(File.content), File.sha256,
            Person.printed_name, File.made_at,
        )
        .join(Person, Person.id == File.made_by)
        .where(File.id == file_id)
    )  # fmt: skip
    row = session.execute(asked).first()
    return None if row is None else FileFact(*row)
