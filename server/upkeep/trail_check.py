"""Checking that the trail's chain holds, and that the record is what the trail noted."""

import re
from array import array
from collections import Counter
from collections.abc import Iterator, Mapping, Sequence
from contextlib import closing
from datetime import UTC, datetime, timedelta
from typing import Any

from sqlalchemy.orm import Session

from server.lab.integrity import first_broken, noted_briefly
from server.records.queries.load_kept import (
    PROPOSED,
    PULLED,
    USED_UP,
    Done,
    acts_in_rows,
    load_kept_sheets,
    sheet_ids,
    sheets_of_certificates,
    states_as_they_stand,
)
from server.records.trail import GENESIS, DoesNotHold, TrailCheck, read_chain
from server.records.transaction import Transactions
from server.upkeep.file_check import FileCheck
from server.upkeep.shelf_check import ShelfCheck

_EPOCH = datetime(1970, 1, 1, tzinfo=UTC)
#: Sheets whose rows are held in memory together.
_TOGETHER = 100
_KNOWN = re.compile(r"^Row ([0-9]{1,18}): ([0-9a-fA-F]{64})\s*$", re.MULTILINE)
_STATES = (USED_UP, PROPOSED, PULLED)


def check_trail(
    transactions: Transactions, *, known: Mapping[int, str] | None = None
) -> TrailCheck:
    """Return whether chain, anchors, sheets, shelf, files and states hold; name the first not.

    ``known`` maps numbers of rows to hashes that were kept outside the database.
    """
    return transactions.read(lambda session: check_record(session, known=known))


def check_record(session: Session, *, known: Mapping[int, str] | None = None) -> TrailCheck:
    """Return the same of the state of the database that a session sees."""
    return _Checking(session).check(known or {})


def read_known(text: str) -> dict[int, str]:
    """Return numbers and hashes of rows from lines “Row 152: 9f86…”; other lines are passed over.

    Raises:
        ValueError: there is no such line, or two of them disagree.
    """
    known: dict[int, str] = {}
    for seq, row_hash in _KNOWN.findall(text):
        if known.setdefault(int(seq), row_hash.lower()) != row_hash.lower():
            says = f"two hashes of row {seq} stand in it."
            raise ValueError(says)
    if not known:
        raise ValueError("it holds no line such as “Row 152: 9f86…”, with 64 digits.")
    return known


class _Checking:
    """One reading of the whole: first the chain, then what rests on it."""

    def __init__(self, session: Session) -> None:
        self._session = session
        self._seq, self._hash = 0, GENESIS
        self._of_certificate = sheets_of_certificates(session)
        self._rows_of: dict[str, array[int]] = {}
        self._noted: dict[Done, list[tuple[int, str]]] = {}
        self._counted: Counter[str] = Counter()
        self._shelf, self._files = ShelfCheck(), FileCheck()

    def check(self, known: Mapping[int, str]) -> TrailCheck:
        holds, says = True, ""
        try:
            with closing(read_chain(self._session, known=known)) as chain:
                for row in chain:
                    self._seq, self._hash = row.seq, row.hash
                    self._take(row)
                    self._shelf.take(row)
                    self._files.take(row)
            self._check_sheets()
            self._counted["bottles"] = self._shelf.check(self._session)
            self._counted["files"] = self._files.check(self._session)
            self._check_states()
            says = self._told()
        except DoesNotHold as broken:
            holds, says = False, broken.says
        return TrailCheck(holds, self._seq, says, self._seq, self._hash)

    def _take(self, row: Any) -> None:
        """Remember which rows speak of which sheet, and the acts that change a thing's state."""
        sheet_id = row.thing_id if row.kind == "sheet" else None
        if row.kind == "certificate":
            sheet_id = self._of_certificate.get(row.thing_id)
        if sheet_id is not None:
            self._rows_of.setdefault(sheet_id, array("q")).append(row.seq)
        elif row.act in _STATES or row.act.startswith(("held a ", "released a ")):
            at = _EPOCH + timedelta(microseconds=row.at)
            done = Done(row.act, row.kind, row.thing_id, row.person_id, at, row.why)
            self._noted.setdefault(done, []).append((row.seq, row.thing_name))

    def _check_sheets(self) -> None:
        kept = sheet_ids(self._session)
        there = set(kept)
        gone = [one for one in self._rows_of if one not in there]
        for wanted in _together([*kept, *gone]):
            seqs = [seq for one in wanted for seq in self._rows_of.get(one, ())]
            for sheet in load_kept_sheets(self._session, wanted, acts_in_rows(seqs)):
                says = first_broken(sheet)
                if says is not None:
                    raise DoesNotHold(says)
                self._counted["sheets"] += 1
                self._counted["entries"] += len(sheet.entries)
                self._counted["signatures"] += len(sheet.signatures)
                self._counted["certificates"] += len(sheet.certificates)
                self._counted["briefly"] += noted_briefly(sheet)

    def _check_states(self) -> None:
        for done in list(states_as_they_stand(self._session)):
            noted = self._noted.get(done)
            if not noted:
                says = f"That somebody {done.act} at {done.at.isoformat()} was never noted so."
                raise DoesNotHold(says)
            noted.pop()
        for done, left in self._noted.items():
            for seq, name in left:
                says = f"Row {seq} noted that somebody {done.act} ({name}); nothing tells it now."
                raise DoesNotHold(says)

    def _told(self) -> str:
        counted = self._counted
        says = (
            f"The chain holds over {self._seq} rows. {counted['certificates']} certificates are "
            f"anchored in it; {counted['entries']} entries and {counted['signatures']} signatures "
            f"on {counted['sheets']} sheets are as it noted them, and so are {counted['bottles']} "
            f"bottles, their lots, and {counted['files']} files."
        )
        if counted["briefly"]:
            says += (
                f" Of {counted['briefly']} entries an earlier release noted text, unit, place, "
                "strike-through and reason only: what came with them from a device is not held."
            )
        return says


def _together(ids: Sequence[str]) -> Iterator[Sequence[str]]:
    for start in range(0, len(ids), _TOGETHER):
        yield ids[start : start + _TOGETHER]
