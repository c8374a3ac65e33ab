"""Who acts: the person at the desk as a value, and the proof that she gave her password."""

from dataclasses import dataclass
from datetime import datetime

from server.lab.refusal import NotAllowed
from server.lab.roles import Act, holders, may


@dataclass(frozen=True, slots=True)
class Actor:
    """A signed-in person."""

    person_id: str
    printed_name: str
    initials: str
    roles: frozenset[str]
    zone: str

    def may(self, act: Act) -> bool:
        """Say whether this person's roles allow the act."""
        return may(self.roles, act)

    def need(self, act: Act) -> None:
        """Refuse unless this person's roles allow the act."""
        if not self.may(act):
            says = f"To {act.value} you need the role {' or '.join(holders(act))}."
            raise NotAllowed(says)


@dataclass(frozen=True, slots=True)
class Proof:
    """That this person gave her password for one signature at this instant."""

    person_id: str
    given_at: datetime
