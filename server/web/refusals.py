"""Refusals that only HTTP knows."""

from server.lab.refusal import NotAllowed, NotSignedIn, Refusal


class NotFromHere(NotAllowed):
    """A write that does not carry this session's token, or that another site has sent."""


class TokenRefused(NotSignedIn):
    """A token for scripts that does not hold."""


class Unreadable(Refusal):
    """A request that is not what its kind says: no JSON, no UTF-8."""


class TooLarge(Refusal):
    """More bytes than a request may hold."""


class WrongKind(Refusal):
    """A body of a kind that is not taken here."""
