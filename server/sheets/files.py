"""An original that was kept, as it is handed out."""

from dataclasses import dataclass
from datetime import datetime

from sqlalchemy.orm import Session

from server.intake.kept_files import sha256_of
from server.lab.actor import Actor
from server.lab.refusal import NotAllowed, NotFound
from server.records.tables.stores import File
from server.sheets.parts.doors import need_reader


@dataclass(frozen=True, slots=True)
class KeptFile:
    """The bytes of an original, with its name, its media type by content, and its SHA-256."""

    name: str
    media_type: str
    sha256: str
    content: bytes


def open_file(session: Session, file_id: str, *, actor: Actor | None, now: datetime) -> KeptFile:
    """Return an original exactly as it came.

    Raises:
        NotFound: there is no such file.
        NotAllowed: its bytes no longer have the hash that was noted when it came.
        NotSignedIn: a visitor.
    """
    del now
    need_reader(actor)
    row = session.get(File, file_id)
    if row is None:
        raise NotFound("There is no such file.", field="file_id")
    if sha256_of(row.content) != row.sha256:
        says = f"{row.name} is no longer what was kept: its SHA-256 should be {row.sha256}."
        raise NotAllowed(says, field="file_id")
    return KeptFile(row.name, row.media_type, row.sha256, row.content)
