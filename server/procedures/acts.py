"""Noting an act in the trail."""

from collections.abc import Mapping
from dataclasses import dataclass
from datetime import datetime
from typing import Any

from sqlalchemy.orm import Session

from server.lab.actor import Actor
from server.records.trail import note


@dataclass(frozen=True, slots=True)
class Thing:
    """What an act is about: its kind, its id, and the name that a reader knows it by."""

    kind: str
    id: str
    name: str


def note_act(
    session: Session,
    act: str,
    thing: Thing,
    *,
    actor: Actor,
    now: datetime,
    why: str | None = None,
    body: Mapping[str, Any] | None = None,
) -> None:
    """Note in the trail that somebody did something to a thing."""
    note(
        session,
        actor=actor,
        act=act,
        kind=thing.kind,
        thing_id=thing.id,
        thing_name=thing.name,
        why=why or None,
        body=body or {},
        now=now,
        zone=actor.zone,
    )
