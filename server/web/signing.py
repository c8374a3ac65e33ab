"""Acts that ask for the password again; page and API sign in the same way."""

from dataclasses import dataclass, field
from typing import Any

from server.lab.refusal import Unacceptable
from server.lab.roles import Act
from server.procedures.countersign import Countersign, countersign_sheet
from server.procedures.hand_in import HandIn, evaluate_sheet, hand_in_sheet, prepare_hand_in
from server.procedures.people import ChangePassword, change_password, hash_new_password
from server.procedures.sign_in import SignedIn, find_own_account, record_sign_in
from server.sheets.queue import need_waiting
from server.web.acting import act, first_answer
from server.web.proving import prove, prove_to_sign
from server.web.visits import Visit


@dataclass(frozen=True, slots=True)
class Given:
    """What a signer gives: the password, and for the first signature of a session her name."""

    name: str
    password: str = field(repr=False)


def hand_in(visit: Visit, command: HandIn, given: Given, *, key: str | None) -> Any:
    """Hand in a sheet as *measured*: read, evaluate with nothing open, then sign."""
    earlier = first_answer(visit, hand_in_sheet, command, key=key)
    if earlier is not None:
        return earlier
    prepared = visit.read(prepare_hand_in, command.sheet_id)
    proof = prove_to_sign(visit, given.name, given.password)
    evaluated = evaluate_sheet(prepared)
    return act(visit, hand_in_sheet, command, evaluated, key=key, proof=proof)


def set_second_signature(
    visit: Visit, command: Countersign, given: Given, *, key: str | None
) -> Any:
    """Countersign a sheet and issue its certificate."""
    visit.person.need(Act.COUNTERSIGN)
    earlier = first_answer(visit, countersign_sheet, command, key=key)
    if earlier is not None:
        return earlier
    visit.read(need_waiting, command.sheet_id)
    proof = prove_to_sign(visit, given.name, given.password)
    return act(visit, countersign_sheet, command, key=key, proof=proof)


def renew_password(visit: Visit, old: str, new: str) -> SignedIn:
    """Change one's own password; all sessions end and this browser gets a new one."""
    actor = visit.person
    parts = visit.parts
    try:
        hashed = hash_new_password(new, names=(actor.printed_name,))
    except Unacceptable as refusal:
        refusal.field = "new"
        raise
    proof = prove(visit, old, field="old")

    def work(session: Any) -> SignedIn | None:
        now = parts.clock()
        change_password(
            session, ChangePassword(new), password_hash=hashed, actor=actor, proof=proof, now=now
        )
        check = find_own_account(session, actor, source=visit.source, now=now)
        return record_sign_in(session, check, holds=True, source=visit.source, now=now)

    signed = parts.transactions.write(work)
    assert signed is not None  # noqa: S101 - the account was locked in this transaction
    return signed
