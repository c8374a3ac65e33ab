"""The laboratory itself: set up once, and its settings."""

from collections.abc import Mapping
from dataclasses import dataclass, field
from datetime import datetime
from typing import Any
from uuid import uuid4

from sqlalchemy.orm import Session

from server.lab.actor import Actor
from server.lab.free_text import read_text
from server.lab.limits import check_limits
from server.lab.own_site import PAPERS, read_base_url, read_country, read_paper
from server.lab.people import check_name, initials_of, sign_in_key
from server.lab.refusal import NotAllowed, SavedFirst, Unacceptable
from server.lab.roles import Act, Role
from server.lab.validity import read_zone
from server.procedures.acts import Thing, note_act
from server.records.queries.loading import (
    laboratory_row,
    there_is_a_laboratory,
    there_is_anybody,
)
from server.records.tables.people import Laboratory, Person

#: The laboratory's one thing in the trail has no id of its own.
LABORATORY_ID = "00000000-0000-0000-0000-000000000000"
_SETTINGS: Mapping[str, Any] = {
    "shelf_open": True,
    "limits": {},
    "idle_minutes": 30,
    "absolute_hours": 12,
    "base_url": "",
    "label_value": False,
    "paper": PAPERS[0],
}


@dataclass(frozen=True, slots=True)
class SetUpLaboratory:
    """The laboratory's first day: its name and its first steward."""

    name: str
    address: str
    zone: str
    sign_in_name: str
    printed_name: str
    password: str = field(repr=False)
    country: str = ""


@dataclass(frozen=True, slots=True)
class ChangeSettings:
    """The laboratory's settings as they shall be; ``revision`` is the one that was read.

    What is None stays as it is. ``country`` is that of ISO 3166-1, ``base_url`` the laboratory's
    own address; ``label_value`` prints the certified value on labels, ``paper`` is that of
    certificates.
    """

    name: str
    address: str
    zone: str
    revision: int
    shelf_open: bool | None = None
    own_signature: bool | None = None
    limits: dict[str, str] | None = None
    idle_minutes: int | None = None
    country: str | None = None
    base_url: str | None = None
    label_value: bool | None = None
    paper: str | None = None


def set_up_laboratory(
    session: Session, command: SetUpLaboratory, *, password_hash: str, now: datetime
) -> str:
    """Set up the laboratory with its first steward; return the steward's id.

    Raises:
        NotAllowed: it is set up already.
    """
    if there_is_a_laboratory(session) or there_is_anybody(session):
        raise NotAllowed("This laboratory is set up already; a steward adds people.")
    read_zone(command.zone)
    laboratory = Laboratory(
        id=1,
        name=check_name(command.name, "name", example="Waterworks laboratory"),
        address=read_text(command.address, "address"),
        zone=command.zone,
        settings={**_SETTINGS, "country": read_country(command.country)},
    )
    steward = Person(
        id=str(uuid4()),
        sign_in_name=sign_in_key(
            check_name(command.sign_in_name, "sign_in_name", example="m.lind")
        ),
        printed_name=check_name(command.printed_name, "printed_name", example="Maren Lind"),
        initials=initials_of(command.printed_name),
        password_hash=password_hash,
        roles=[Role.STEWARD.value],
        made_at=now,
    )
    session.add_all([laboratory, steward])
    session.flush()
    actor = Actor(
        person_id=steward.id,
        printed_name=steward.printed_name,
        initials=steward.initials,
        roles=frozenset(steward.roles),
        zone=command.zone,
    )
    note_act(
        session,
        "set up the laboratory",
        Thing("laboratory", LABORATORY_ID, laboratory.name),
        actor=actor,
        now=now,
        body={"name": laboratory.name, "zone": laboratory.zone, "steward": steward.printed_name},
    )
    return steward.id


def change_settings(
    session: Session, command: ChangeSettings, *, actor: Actor, now: datetime
) -> int:
    """Change the laboratory's settings; return the new revision.

    Raises:
        SavedFirst: somebody else changed them since they were read.
    """
    actor.need(Act.ADMINISTER)
    row = laboratory_row(session)
    session.refresh(row, with_for_update=True)
    before = _as_read(row)
    if row.revision != command.revision:
        says = "Somebody else changed the settings meanwhile; look at both and save again."
        raise SavedFirst(says, field="revision", shown={"standing": before})
    read_zone(command.zone)
    check_limits(command.limits or {}, "limits")
    if command.idle_minutes is not None and not 1 <= command.idle_minutes <= 12 * 60:
        says = "idle_minutes must be from 1 to 720."
        raise Unacceptable(says, field="idle_minutes", example="30")
    row.name = check_name(command.name, "name", example="Waterworks laboratory")
    row.address = read_text(command.address, "address")
    row.zone = command.zone
    if command.own_signature is not None:
        row.own_signature = command.own_signature
    row.settings = {**row.settings, **_stated(command)}
    row.revision += 1
    session.flush()
    note_act(
        session,
        "changed the settings",
        Thing("laboratory", LABORATORY_ID, row.name),
        actor=actor,
        now=now,
        body={"before": before, "after": _as_read(row)},
    )
    return row.revision


def _stated(command: ChangeSettings) -> dict[str, Any]:
    """Return the settings that stay as they are unless they are given."""
    given: dict[str, Any] = {}
    if command.shelf_open is not None:
        given["shelf_open"] = command.shelf_open
    if command.limits is not None:
        given["limits"] = dict(command.limits)
    if command.idle_minutes is not None:
        given["idle_minutes"] = command.idle_minutes
    if command.country is not None:
        given["country"] = read_country(command.country)
    if command.base_url is not None:
        given["base_url"] = read_base_url(command.base_url)
    if command.paper is not None:
        given["paper"] = read_paper(command.paper)
    if command.label_value is not None:
        given["label_value"] = command.label_value
    return given


def _as_read(row: Laboratory) -> dict[str, Any]:
    return {
        "name": row.name,
        "address": row.address,
        "zone": row.zone,
        "own_signature": row.own_signature,
        "settings": dict(row.settings),
        "revision": row.revision,
    }
