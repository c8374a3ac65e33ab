"""Entries as the door for entries needs them."""

from sqlalchemy import select
from sqlalchemy.orm import Session

from server.records.tables.bench import Entry


def entry_of_device(session: Session, device_id: str, sequence: int) -> str | None:
    """Return the id of the entry that a device sent under a sequence number."""
    return session.scalar(
        select(Entry.id).where(Entry.device_id == device_id, Entry.device_sequence == sequence)
    )
