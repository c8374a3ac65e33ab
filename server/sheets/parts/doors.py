"""Who may open which page."""

from collections.abc import Mapping
from typing import Any

from server.lab.actor import Actor
from server.lab.refusal import NotSignedIn
from server.lab.roles import Act
from server.lab.segregation import release_refusal
from server.lab.states import COUNTERSIGNED
from server.records.queries.list_holds import StandingHold


def need_reader(actor: Actor | None) -> Actor:
    """Return the signed-in person, or refuse a visitor."""
    if actor is None:
        raise NotSignedIn("Sign in to read this page.")
    actor.need(Act.READ)
    return actor


def need_shelf(settings: Mapping[str, Any], actor: Actor | None) -> None:
    """Refuse a visitor where the laboratory has closed its shelf."""
    if actor is None and not settings.get("shelf_open", True):
        raise NotSignedIn("This laboratory shows its shelf to its own people only: sign in.")


def may_read_number(actor: Actor, state: str) -> bool:
    """Say whether a person may read what a sheet comes to: everybody once it is certified."""
    return state == COUNTERSIGNED or actor.may(Act.READ_UNCERTIFIED)


def may_hold(actor: Actor | None, hold: StandingHold | None) -> bool:
    """Say whether a person may hold a thing that nobody holds yet."""
    return actor is not None and hold is None and actor.may(Act.HOLD)


def may_release(actor: Actor | None, hold: StandingHold | None) -> bool:
    """Say whether a person may release what somebody else holds."""
    if actor is None or hold is None or not actor.may(Act.RELEASE):
        return False
    return release_refusal(hold.held_by, actor.person_id) is None
