"""Hands that do the demo laboratory's work through the procedures, one act a transaction."""

from base64 import b64encode
from collections.abc import Callable, Iterator, Mapping, Sequence
from contextlib import contextmanager
from dataclasses import dataclass, field, replace
from datetime import datetime, timedelta
from random import Random
from typing import Any, TypeVar
from uuid import UUID

from sqlalchemy.orm import Session

from server.demo.cast import Member
from server.demo.simulated import Line
from server.intake.curve_upload import SentCurve
from server.lab.actor import Actor, Proof
from server.lab.curve_entry import SLOT as CURVE
from server.lab.ink import standing
from server.lab.people import initials_of
from server.procedures.bench import BeginSheet, begin_sheet
from server.procedures.countersign import Countersign, countersign_sheet
from server.procedures.entries import WriteEntries, write_entries
from server.procedures.hand_in import (
    HandIn,
    evaluate_sheet,
    failing,
    hand_in_sheet,
    prepare_hand_in,
)
from server.procedures.new_entries import NewEntry
from server.records.queries.load_sheet import load_sheet_facts
from server.records.queries.sheet_trail import last_act_of_sheet
from server.records.transaction import Transactions

T = TypeVar("T")
#: Replicate, name of the file, and what stands in it.
CurveLine = tuple[int, str, str]


@dataclass(slots=True)
class Hands:
    """The demo's people at work; ``random`` makes ids, codes and scatter repeatable."""

    transactions: Transactions
    zone: str
    random: Random
    ids: dict[str, str] = field(default_factory=dict)

    @contextmanager
    def chance_of(self, seed: int) -> Iterator[None]:
        """Let a part of the story have chances of its own, so that the others keep theirs."""
        usual, self.random = self.random, Random(seed)  # noqa: S311 - scatter, nothing secret
        try:
            yield
        finally:
            self.random = usual

    def actor(self, member: Member) -> Actor:
        """Return a member as the one who acts."""
        return Actor(
            person_id=self.ids[member.sign_in_name],
            printed_name=member.printed_name,
            initials=initials_of(member.printed_name),
            roles=frozenset(member.roles),
            zone=self.zone,
        )

    def do(
        self, procedure: Callable[..., T], command: Any, member: Member, at: datetime, **more: Any
    ) -> T:
        """Run one procedure as one member at one instant, in its own transaction."""

        def work(session: Session) -> T:
            return procedure(session, command, actor=self.actor(member), now=at, **more)

        return self.transactions.write(work)

    def begin(self, command: BeginSheet, member: Member, at: datetime) -> str:
        """Begin a bench sheet."""
        return self.do(begin_sheet, command, member, at)

    def write(self, sheet_id: str, lines: Sequence[Line], member: Member, at: datetime) -> None:
        """Write entries on a sheet."""
        entries = tuple(self._entry(line) for line in lines)
        self.do(write_entries, WriteEntries(sheet_id, entries), member, at)

    def correct(self, sheet_id: str, line: Line, reason: str, member: Member, at: datetime) -> None:
        """Strike what stands in a row and write it anew."""
        facts = self.transactions.read(lambda session: load_sheet_facts(session, sheet_id))
        stands = standing(facts.entries)[(line[0], line[1], 1)]
        entry = self._entry(line, strikes=stands.id, reason=reason)
        self.do(write_entries, WriteEntries(sheet_id, (entry,)), member, at)

    def write_curve(
        self, sheet_id: str, curve: CurveLine, member: Member, at: datetime, *, again: str = ""
    ) -> None:
        """Write a curve with its file; ``again`` says why the one that stands is struck."""
        replicate, name, text = curve
        strikes = None
        if again:
            facts = self.transactions.read(lambda session: load_sheet_facts(session, sheet_id))
            strikes = standing(facts.entries)[(replicate, CURVE, 1)].id
        blank = self._entry((replicate, CURVE, ""), strikes=strikes, reason=again or None)
        content = b64encode(text.encode()).decode("ascii")
        entry = replace(blank, curve=SentCurve(file_name=name, content_base64=content))
        self.do(write_entries, WriteEntries(sheet_id, (entry,)), member, at)

    def leave_out(
        self, sheet_id: str, replicate: int, why: tuple[str, str], member: Member, at: datetime
    ) -> None:
        """Leave a replicate out of the mean, with criterion and reason."""
        entry = self._entry((replicate, "excluded", why[0]), reason=why[1])
        self.do(write_entries, WriteEntries(sheet_id, (entry,)), member, at)

    def hand_in(
        self,
        sheet_id: str,
        member: Member,
        at: datetime,
        *,
        reasons: Mapping[str, str] | None = None,
    ) -> None:
        """Evaluate a sheet and hand it in; what fails without a reason of its own gets a plain one.

        Signatures of the demo need no password: nobody sits at the keyboard yet.
        """
        actor = self.actor(member)
        prepared = self.transactions.read(
            lambda session: prepare_hand_in(session, sheet_id, actor=actor, now=at)
        )
        evaluated = evaluate_sheet(prepared)
        names = failing(evaluated.result["findings"])
        given = {
            name: (reasons or {}).get(
                name, "bottle opened daily for a week; the older value stood for fresh lye"
            )
            for name in names
        }
        command = HandIn(sheet_id, prepared.revision, given)
        proof = Proof(actor.person_id, at)
        self.transactions.write(
            lambda session: hand_in_sheet(
                session, command, evaluated, actor=actor, proof=proof, now=at
            )
        )

    def countersign(self, sheet_id: str, member: Member, at: datetime) -> None:
        """Countersign a sheet, accepting by name what fails."""
        facts = self.transactions.read(lambda session: load_sheet_facts(session, sheet_id))
        accepted = failing(facts.evaluation.result["findings"]) if facts.evaluation else []
        seen = self.transactions.read(lambda session: last_act_of_sheet(session, sheet_id))
        command = Countersign(sheet_id, facts.revision, tuple(accepted), trail_seen=seen)
        proof = Proof(self.ids[member.sign_in_name], at)
        self.do(countersign_sheet, command, member, at, proof=proof)

    def _entry(
        self, line: Line, *, strikes: str | None = None, reason: str | None = None
    ) -> NewEntry:
        replicate, slot, text = line
        uuid = str(UUID(int=self.random.getrandbits(128), version=4))
        return NewEntry(
            id=uuid, replicate=replicate, slot=slot, text=text, strikes=strikes, reason=reason
        )


def minutes(count: float) -> timedelta:
    """Return a span of minutes."""
    return timedelta(minutes=count)
