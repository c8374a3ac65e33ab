"""People and the laboratory's settings, kept by a steward."""

from typing import Any

from fastapi import APIRouter, Response

from server.lab.roles import Act
from server.procedures.laboratory import ChangeSettings, change_settings
from server.procedures.people import (
    AddPerson,
    ChangeRoles,
    CloseAccount,
    add_person,
    change_roles,
    close_account,
    hash_new_password,
)
from server.records.queries.loading import laboratory_row
from server.sheets.people import open_people
from server.web.forms.posts import Again, Post, Posted
from server.web.showing import show
from server.web.visits import AtDesk, Visit

router = APIRouter()
_AGAIN = Again("people/home.html", open_people)
_TICKED = Again("people/home.html", open_people, keeps_typed=False)


@router.get("/people")
def home(visit: AtDesk) -> Response:
    """Show people and settings."""
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


@router.post("/laboratory")
def settings(post: Posted) -> Response:
    """Change the laboratory's settings."""

    def work() -> str:
        post.visit.person.need(Act.ADMINISTER)
        post.act(change_settings, _settings(post))
        return "/people"

    return post.answer(work, again=_AGAIN)


def _settings(post: Post) -> ChangeSettings:
    form, kept = post.form, kept_settings(post.visit)
    return ChangeSettings(
        name=form.text("name"),
        address=form.text("address"),
        zone=form.text("zone").strip(),
        revision=form.whole("revision", example="1"),
        shelf_open=bool(form.text("shelf_open")),
        own_signature=bool(form.text("own_signature")),
        limits=kept.get("limits", {}),
        idle_minutes=kept.get("idle_minutes", 30),
    )


def kept_settings(visit: Visit) -> dict[str, Any]:
    """Return the settings that the form does not show, so that saving it keeps them."""
    return visit.parts.transactions.read(lambda session: dict(laboratory_row(session).settings))
