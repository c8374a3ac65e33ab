"""People, kept by a steward."""

from fastapi import APIRouter, Response

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
from server.web.forms.posts import Again, Posted
from server.web.showing import show
from server.web.visits import AtDesk

router = APIRouter()
_AGAIN = Again("people/home.html", open_people)
_TICKED = Again("people/home.html", open_people, keeps_typed=False)


@router.get("/people")
def home(visit: AtDesk) -> Response:
    """Show people."""
    return show(visit, "people/home.html", open_people)


@router.post("/people/new")
def add(post: Posted) -> Response:
    """Add a person with a first password."""

    def work() -> str:
        form = post.form
        post.visit.person.need(Act.ADMINISTER)
        command = AddPerson(
            sign_in_name=form.text("sign_in_name"),
            printed_name=form.text("printed_name"),
            roles=form.all("roles"),
            password=form.text("password"),
            initials=form.text("initials"),
        )
        names = (command.printed_name, command.sign_in_name)
        hashed = hash_new_password(command.password, names=names)
        post.act(add_person, command, password_hash=hashed)
        return "/people"

    return post.answer(work, again=_AGAIN)


@router.post("/people/{person_id}/roles")
def roles(post: Posted, person_id: str) -> Response:
    """Change a person's roles."""

    def work() -> str:
        revision = post.form.whole("revision", example="1")
        post.act(change_roles, ChangeRoles(person_id, post.form.all("roles"), revision))
        return "/people"

    return post.answer(work, again=_TICKED)


@router.post("/people/{person_id}/close")
def close(post: Posted, person_id: str) -> Response:
    """Close an account for good."""

    def work() -> str:
        post.act(close_account, CloseAccount(person_id, post.form.text("reason")))
        return "/people"

    return post.answer(work, again=_TICKED)
