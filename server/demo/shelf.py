"""Life on the demonstration's shelf: a bottle opened, what it was used for, who watches what."""

from collections.abc import Callable
from datetime import datetime

from server.demo.cast import BASHIR, IMKE, JONAS
from server.demo.hands import Hands
from server.procedures.bottles import OpenBottle, open_bottle
from server.procedures.uses import UseBottle, use_bottle
from server.procedures.watches import WatchThing, watch_thing

#: Results that rest on the acid: days ago, number, what for.
_USES = (
    (50.0, "W-0412", "alkalinity, raw water", BASHIR),
    (21.1, "W-0588", "alkalinity, reservoir 2", IMKE),
    (2.4, "W-0631", "alkalinity, mains", IMKE),
)


def use_the_acid(hands: Hands, acid: str, before: Callable[[float], datetime]) -> None:
    """Open the acid's bottle and write down what it was used for."""
    hands.do(open_bottle, OpenBottle(acid), BASHIR, before(50.1))
    for days, result, says, member in _USES:
        hands.do(use_bottle, UseBottle(acid, result, says=says), member, before(days))


def watch(hands: Hands, bottle: str, before: Callable[[float], datetime]) -> None:
    """Let the keeper watch a bottle, so that he is told when somebody doubts it."""
    hands.do(watch_thing, WatchThing("bottle", bottle), JONAS, before(2.9))
