"""The laboratory's settings, kept by a steward."""

from typing import Any

from fastapi import APIRouter, Response

from server.lab.roles import Act
from server.procedures.label_hazards import (
    ConfirmHazards,
    WithdrawHazards,
    confirm_hazards,
    withdraw_hazards,
)
from server.procedures.laboratory import ChangeSettings, change_settings
from server.records.queries.loading import laboratory_row
from server.sheets.laboratory import open_laboratory
from server.web.forms.posts import Again, Post, Posted
from server.web.showing import show
from server.web.visits import AtDesk, Visit

router = APIRouter()
_AGAIN = Again("laboratory/home.html", open_laboratory)


@router.get("/laboratory")
def home(visit: AtDesk) -> Response:
    """Show the laboratory's settings."""
    return show(visit, "laboratory/home.html", open_laboratory)


@router.post("/laboratory")
def settings(post: Posted) -> Response:
    """Change the laboratory's settings."""

    def work() -> str:
        post.visit.person.need(Act.ADMINISTER)
        post.act(change_settings, _settings(post))
        return "/laboratory"

    return post.answer(work, again=_AGAIN)


@router.post("/laboratory/hazards")
def hazards(post: Posted) -> Response:
    """Keep what labels of a solution show, as the responsible person confirmed it."""

    def work() -> str:
        form = post.form
        command = ConfirmHazards(
            titrant=form.text("titrant"),
            nominal=form.decimal("nominal"),
            medium=form.text("medium", "water"),
            confirmed_by=form.text("confirmed_by"),
            confirmed_on=form.text("confirmed_on"),
            pictograms=form.all("pictograms"),
            signal_word=form.text("signal_word"),
            statements=form.text("statements"),
            revision=form.whole("revision", example="1"),
        )
        post.act(confirm_hazards, command)
        return "/laboratory#hazards"

    return post.answer(work, again=_AGAIN)


@router.post("/laboratory/hazards/withdraw")
def withdraw(post: Posted) -> Response:
    """Show no hazards on labels of a solution any more."""

    def work() -> str:
        form = post.form
        command = WithdrawHazards(
            titrant=form.text("titrant"),
            nominal=form.text("nominal"),
            medium=form.text("medium", "water"),
            reason=form.text("reason"),
            revision=form.whole("revision", example="1"),
        )
        post.act(withdraw_hazards, command)
        return "/laboratory#hazards"

    return post.answer(work, again=_AGAIN)


def _settings(post: Post) -> ChangeSettings:
    """Return the settings of the form; a field that it does not hold stays as it is."""
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
        country=form.text("country") if "country" in form.values else None,
        base_url=form.text("base_url") if "base_url" in form.values else None,
        paper=form.text("paper") if "paper" in form.values else None,
        # a tick that is off is not sent: the form says that it has one
        label_value=bool(form.text("label_value")) if "labels" in form.values else None,
    )


def kept_settings(visit: Visit) -> dict[str, Any]:
    """Return the settings that the form does not show, so that saving it keeps them."""
    return visit.parts.transactions.read(lambda session: dict(laboratory_row(session).settings))
