"""What bottles were used for, as it is read."""

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class UseLine:
    """A use of a bottle. ``state_then`` is the state that the bottle had at that instant.

    ``by_token`` is the name of the token by which a script wrote it, ``struck`` says who struck it
    through and why; both empty otherwise.
    """

    id: str
    bottle: str
    result_id: str
    certificate: str
    used: str
    used_at: str
    state_then: str
    in_force_then: bool
    says: str
    by: str
    by_token: str
    struck: str


@dataclass(frozen=True, slots=True)
class UsesView:
    """Uses of a lot or bottle, used last first, from a day on; ``since`` is empty for all."""

    uses: tuple[UseLine, ...]
    says: str
    since: str
    may_write: bool
