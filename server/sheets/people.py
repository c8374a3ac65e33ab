"""People and the laboratory's settings as the steward reads them."""

from dataclasses import dataclass
from datetime import datetime

from sqlalchemy.orm import Session

from server.lab.actor import Actor
from server.lab.roles import Act, Role
from server.records.queries.list_people import all_people
from server.records.queries.list_sheets import count_waiting
from server.records.queries.loading import laboratory_row, there_is_a_laboratory
from server.sheets.notices_page import count_unread
from server.sheets.parts.doors import need_reader


@dataclass(frozen=True, slots=True)
class PersonLine:
    """A person in the list."""

    id: str
    sign_in_name: str
    printed_name: str
    initials: str
    roles: tuple[str, ...]
    active: bool
    revision: int


@dataclass(frozen=True, slots=True)
class PeoplePage:
    """The people page."""

    people: tuple[PersonLine, ...]
    roles: tuple[str, ...]
    laboratory: str
    address: str
    zone: str
    own_signature: bool
    shelf_open: bool
    revision: int


@dataclass(frozen=True, slots=True)
class Chrome:
    """What every page shows around itself: who is here, where, how many sheets and notices wait.

    ``person_id`` keeps one person's unsent entries apart from another's on a shared tablet.
    """

    laboratory: str
    printed_name: str | None
    initials: str | None
    roles: tuple[str, ...]
    waiting: int
    person_id: str | None = None
    unread: int = 0


def open_chrome(session: Session, *, actor: Actor | None, now: datetime) -> Chrome:
    """Return what every page shows around itself; a visitor learns the laboratory's name only."""
    name = laboratory_row(session).name if there_is_a_laboratory(session) else ""
    if actor is None:
        return Chrome(name, None, None, (), 0)
    return Chrome(
        laboratory=name,
        printed_name=actor.printed_name,
        initials=actor.initials,
        roles=tuple(sorted(actor.roles)),
        waiting=count_waiting(session),
        person_id=actor.person_id,
        unread=count_unread(session, actor.person_id, now=now),
    )


def open_people(session: Session, *, actor: Actor | None, now: datetime) -> PeoplePage:
    """Return the people and the laboratory's settings, for the steward.

    Raises:
        NotSignedIn: a visitor.
        NotAllowed: somebody else than a steward.
    """
    del now
    need_reader(actor).need(Act.ADMINISTER)
    laboratory = laboratory_row(session)
    return PeoplePage(
        people=tuple(
            PersonLine(
                id=one.id,
                sign_in_name=one.sign_in_name,
                printed_name=one.printed_name,
                initials=one.initials,
                roles=tuple(one.roles),
                active=one.active,
                revision=one.revision,
            )
            for one in all_people(session)
        ),
        roles=tuple(role.value for role in Role),
        laboratory=laboratory.name,
        address=laboratory.address,
        zone=laboratory.zone,
        own_signature=laboratory.own_signature,
        shelf_open=bool(laboratory.settings.get("shelf_open", True)),
        revision=laboratory.revision,
    )
