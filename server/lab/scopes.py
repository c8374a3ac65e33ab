"""What a token for scripts may do: nothing beyond its scopes, and never more than its person."""

from collections.abc import Iterable
from enum import StrEnum

from server.lab.actor import Actor
from server.lab.refusal import Unacceptable
from server.lab.roles import Act

MOST_DAYS = 366


class Scope(StrEnum):
    """One thing that a token opens."""

    LOOK_UP = "look up"
    USES = "record uses"
    EXPORT = "export"


SAYS: dict[Scope, str] = {
    Scope.LOOK_UP: "read bottles: state, number, date",
    Scope.USES: "write down what a bottle was used for",
    Scope.EXPORT: "read lists, uses and certificates as files",
}


def read_scopes(given: Iterable[str], actor: Actor) -> tuple[Scope, ...]:
    """Return the scopes that a person gives a token, in their usual order.

    Raises:
        Unacceptable: none, an unknown one, or one that the person's own roles do not allow.
    """
    known = {scope.value for scope in Scope}
    asked = {word.strip() for word in given if word.strip()}
    if not asked:
        says = "Tick at least one thing that the token may do."
        raise Unacceptable(says, field="scopes", example=Scope.LOOK_UP.value)
    for word in sorted(asked - known):
        says = f"scopes cannot hold “{word[:40]}”; known are {', '.join(sorted(known))}."
        raise Unacceptable(says, field="scopes", example=Scope.LOOK_UP.value)
    if Scope.USES.value in asked and not actor.may(Act.USE):
        says = "A token cannot record uses for you: your own roles do not allow it."
        raise Unacceptable(says, field="scopes", example=Scope.LOOK_UP.value)
    return tuple(scope for scope in Scope if scope.value in asked)


def read_days(days: int) -> int:
    """Return for how many days a token is to hold.

    Raises:
        Unacceptable: none, or more than a year.
    """
    if not 1 <= days <= MOST_DAYS:
        says = f"days must be from 1 to {MOST_DAYS}: a token ends by itself."
        raise Unacceptable(says, field="days", example="90")
    return days
