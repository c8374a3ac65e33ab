"""What the laboratory answers when it will not do something: a sentence, the field, an example."""

from collections.abc import Mapping
from typing import Any


class Refusal(Exception):
    """A request that is refused in words; nothing was changed and nothing typed is lost.

    Attributes:
        says: what is wrong and what to do, one or two plain sentences.
        field: the name of the field it is about, or None.
        example: a value that would be taken, or None.
        shown: what both sides need to see (the two versions of a conflict), JSON-like.
    """

    def __init__(
        self,
        says: str,
        *,
        field: str | None = None,
        example: str | None = None,
        shown: Mapping[str, Any] | None = None,
    ) -> None:
        super().__init__(says)
        self.says = says
        self.field = field
        self.example = example
        self.shown = dict(shown or {})


class NotSignedIn(Refusal):
    """Nobody is signed in, or the password or session did not hold."""


class NotAllowed(Refusal):
    """This person may not do this: a missing role, or one's own work."""


class NotFound(Refusal):
    """There is no such thing."""


class SavedFirst(Refusal):
    """Somebody else saved first; both versions are shown."""


class Stale(Refusal):
    """The request was made from an older revision than the one that stands."""


class Unacceptable(Refusal):
    """A value that cannot be taken."""


class KeyMissing(Refusal):
    """A write came without its idempotency key."""


class TooOften(Refusal):
    """Too many failures; try again after ``shown["retry_after_s"]`` seconds."""


class CannotWrite(Refusal):
    """The database did not take the write; nothing of it was saved."""
