"""Keeping an original as it came, with its hash."""

from datetime import datetime
from uuid import uuid4

from sqlalchemy.orm import Session

from server.intake.kept_files import Original
from server.lab.actor import Actor
from server.records.tables.stores import File


def keep_file(session: Session, original: Original, *, actor: Actor, now: datetime) -> str:
    """Keep an original; return its id. The act that keeps it notes its name and SHA-256."""
    row = File(
        id=str(uuid4()),
        name=original.name,
        media_type=original.media_type,
        sha256=original.sha256,
        content=original.content,
        made_by=actor.person_id,
        made_at=now,
    )
    session.add(row)
    session.flush()
    return row.id
