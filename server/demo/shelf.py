"""Life on the demonstration's shelf: a bottle opened, what it was used for, who watches what."""

from collections.abc import Callable
from datetime import datetime

from server.demo.cast import BASHIR, IMKE, JONAS
from server.demo.hands import Hands
from server.procedures.bottles import OpenBottle, open_bottle
from server.procedures.uses import UseBottle, use_bottle
from server.procedures.watches import WatchThing, watch_thing

#: Results that rest on the acid: days ago, number, what for, who wrote it down later.
_USES = (
    (50.0, "W-0412", "alkalinity, raw water", BASHIR),
    (21.1, "W-0588", "alkalinity, reservoir 2", IMKE),
    (2.4, "W-0631", "alkalinity, mains", IMKE),
)


def open_acid(hands: Hands, acid: str, at: datetime) -> None:
    """Open the acid's bottle."""
    hands.do(open_bottle, OpenBottle(acid), BASHIR, at)


def tell_uses(hands: Hands, acid: str, before: Callable[[float], datetime]) -> None:
    """Write down what the acid was used for, from the results' own times."""
    for turn, (days, result, says, member) in enumerate(_USES):
        used_at = before(days).isoformat()
        command = UseBottle(acid, result, used_at=used_at, says=says)
        hands.do(use_bottle, command, member, before(2.3 - 0.01 * turn))


def watch(hands: Hands, bottle: str, before: Callable[[float], datetime]) -> None:
    """Let the keeper watch a bottle, so that he is told when somebody doubts it."""
    hands.do(watch_thing, WatchThing("bottle", bottle), JONAS, before(2.4))
