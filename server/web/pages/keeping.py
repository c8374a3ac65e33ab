"""Pages that only hold a keeper's form."""

from datetime import datetime
from typing import Any

from server.lab.actor import Actor
from server.lab.refusal import NotSignedIn
from server.lab.roles import Act


def open_for_keeper(session: Any, *, actor: Actor | None, now: datetime) -> None:
    """Open a form that a keeper fills in; it reads nothing.

    Raises:
        NotSignedIn: nobody is signed in.
        NotAllowed: it is no keeper.
    """
    del session, now
    if actor is None:
        raise NotSignedIn("Sign in first.")
    actor.need(Act.KEEP)
