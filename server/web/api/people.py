"""People over the API, for a steward."""

from typing import Annotated

from fastapi import APIRouter, Depends, Response

from server.lab.roles import Act
from server.procedures.people import (
    AddPerson,
    ChangeRoles,
    CloseAccount,
    add_person,
    change_roles,
    close_account,
    hash_new_password,
)
from server.sheets.people import open_people
from server.web.api.desk import AtApi, answer, made
from server.web.bodies import Given, body_of
from server.web.visits import AtDesk

router = APIRouter(tags=["people"])
_ADD, _ROLES = body_of(AddPerson), body_of(ChangeRoles, "person_id")
_CLOSE = body_of(CloseAccount, "person_id")


@router.get("/people")
def people(visit: AtDesk) -> Response:
    """List people."""
    return answer(visit.read(open_people))


@router.post("/people", openapi_extra=_ADD.openapi, status_code=201)
def add(desk: AtApi, given: Annotated[Given, Depends(_ADD)]) -> Response:
    """Add a person with a first password."""
    desk.visit.person.need(Act.ADMINISTER)
    command = AddPerson(**given)
    names = (command.printed_name, command.sign_in_name)
    hashed = hash_new_password(command.password, names=names)
    return made("/api/people", id=desk.act(add_person, command, password_hash=hashed))


@router.post("/people/{person_id}/roles", openapi_extra=_ROLES.openapi)
def roles(desk: AtApi, person_id: str, given: Annotated[Given, Depends(_ROLES)]) -> Response:
    """Change a person's roles."""
    revision = desk.act(change_roles, ChangeRoles(person_id=person_id, **given))
    return answer({"id": person_id, "revision": revision})


@router.post("/people/{person_id}/close", openapi_extra=_CLOSE.openapi)
def close(desk: AtApi, person_id: str, given: Annotated[Given, Depends(_CLOSE)]) -> Response:
    """Close an account for good."""
    desk.act(close_account, CloseAccount(person_id=person_id, **given))
    return answer({"id": person_id, "active": False})
