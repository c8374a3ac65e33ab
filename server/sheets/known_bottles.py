"""Bottles that were looked up before, kept until anything at all is committed."""

from datetime import datetime
from threading import Lock
from typing import Any

from sqlalchemy.orm import Session

from server.records.queries.list_holds import standing_holds
from server.records.queries.list_shelf import BottleOnShelf, LotOnShelf
from server.records.queries.load_lots import bottle_by_code
from server.records.queries.load_papers import load_laboratory_fact
from server.records.transaction import Transactions
from server.records.unchanged import Unchanged
from server.sheets.look_up import tell
from server.sheets.parts.by_code import as_code, find_bottle
from server.sheets.parts.doors import need_shelf

#: Bottles that are kept at most; those of one lot share its certificate.
MOST = 5_000


class KnownBottles:
    """What a visitor gets of a bottle, from memory while the database is unchanged.

    What is kept are the facts, never the answer: the state is computed anew for every instant.
    """

    def __init__(self, transactions: Transactions) -> None:
        self._transactions = transactions
        self._unchanged = Unchanged(transactions.database)
        self._lock = Lock()
        self._version: int | None = None
        self._bottles: dict[str, BottleOnShelf] = {}
        self._lots: dict[str, LotOnShelf] = {}

    def look_up(self, code: str, *, now: datetime) -> dict[str, Any]:
        """Return what ``look_up`` would return to a visitor.

        Raises:
            NotFound: no bottle has this code.
            NotSignedIn: the laboratory has closed its shelf.
        """
        with self._lock:
            # asked before anything is read: what is read is then at least as new
            version = self._unchanged.version()
            if version != self._version or len(self._bottles) >= MOST:
                self._bottles.clear()
                self._lots.clear()
                self._version = version
            one = self._bottles.get(code)
            if one is None:
                one = self._transactions.read(lambda session: self._find(session, code))
                self._bottles[code] = one
                self._lots[one.bottle.lot_id] = one.lot
        return tell(one, now=now)

    def _find(self, session: Session, code: str) -> BottleOnShelf:
        if not self._lots:
            need_shelf(load_laboratory_fact(session).settings, None)
        bottle = bottle_by_code(session, as_code(code))
        lot = self._lots.get(bottle.lot_id) if bottle else None
        if bottle is None or lot is None:
            return find_bottle(session, code)
        holds = standing_holds(session, ("bottle",), thing_ids=(bottle.id,))
        return BottleOnShelf(bottle, lot, holds.get(("bottle", bottle.id)))
