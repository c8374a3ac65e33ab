"""Hazards for labels: written down as the laboratory's responsible person confirmed them."""

from dataclasses import asdict, dataclass
from datetime import datetime
from typing import Any

from sqlalchemy.orm import Session

from server.lab.actor import Actor
from server.lab.free_text import read_reason, read_text
from server.lab.label_hazards import SolutionHazards, check_hazards, kept_hazards
from server.lab.people import check_name
from server.lab.refusal import NotFound, SavedFirst, Unacceptable
from server.lab.roles import Act
from server.lab.validity import local_day, read_day
from server.metrology.decimal_text import DecimalProblem, read_typed_decimal, read_wire_decimal
from server.procedures.acts import Thing, note_act
from server.procedures.laboratory import LABORATORY_ID
from server.records.queries.loading import laboratory_row
from server.records.tables.people import Laboratory

_MOST_STATEMENTS = 600


@dataclass(frozen=True, slots=True)
class ConfirmHazards:
    """What labels of one solution show, as the responsible person confirmed it on a day.

    ``statements`` a line each; ``nominal`` in mol/L as text. It takes the place of what was
    confirmed for the same solution before.
    """

    titrant: str
    nominal: str
    confirmed_by: str
    confirmed_on: str
    revision: int
    medium: str = "water"
    pictograms: tuple[str, ...] = ()
    signal_word: str = ""
    statements: str = ""


@dataclass(frozen=True, slots=True)
class WithdrawHazards:
    """A solution whose labels shall show no hazards any more, with a reason."""

    titrant: str
    nominal: str
    reason: str
    revision: int
    medium: str = "water"


def confirm_hazards(
    session: Session, command: ConfirmHazards, *, actor: Actor, now: datetime
) -> int:
    """Keep what labels of a solution show; return the settings' new revision.

    Raises:
        Unacceptable: nothing to show, no name or day, a day to come, a pictogram that is none.
        SavedFirst: somebody else changed the settings since they were read.
    """
    actor.need(Act.ADMINISTER)
    row = _row(session, command.revision)
    check_hazards(command.pictograms, command.signal_word)
    statements = read_text(command.statements, "statements", most=_MOST_STATEMENTS)
    lines = tuple(line.strip() for line in statements.splitlines() if line.strip())
    if not (command.pictograms or command.signal_word or lines):
        says = "Choose a pictogram or signal word, or write a statement."
        raise Unacceptable(says, field="statements", example="H290 May be corrosive to metals.")
    day = read_day(command.confirmed_on, "confirmed_on")
    if day > local_day(now, actor.zone):
        raise Unacceptable("The day of the confirmation lies in the future.", field="confirmed_on")
    made = SolutionHazards(
        titrant=check_name(command.titrant, "titrant", example="NaOH"),
        nominal=_nominal(command.nominal),
        medium=check_name(command.medium, "medium", example="water"),
        pictograms=tuple(dict.fromkeys(command.pictograms)),
        signal_word=command.signal_word,
        statements=lines,
        confirmed_by=check_name(command.confirmed_by, "confirmed_by", example="Maren Lind"),
        confirmed_on=day.isoformat(),
    )
    others = [one for one in kept_hazards(row.settings) if not _same(one, made)]
    _keep(row, [*others, made])
    session.flush()
    note_act(
        session, "kept hazards for labels", _thing(row), actor=actor, now=now, body=asdict(made)
    )
    return row.revision


def withdraw_hazards(
    session: Session, command: WithdrawHazards, *, actor: Actor, now: datetime
) -> int:
    """Show no hazards on labels of a solution any more; return the settings' new revision.

    Raises:
        NotFound: nothing was confirmed for this solution.
        Unacceptable: no reason.
    """
    actor.need(Act.ADMINISTER)
    row = _row(session, command.revision)
    kept = kept_hazards(row.settings)
    wanted = (command.titrant, command.nominal, command.medium)
    found = next((one for one in kept if one.is_of(*wanted)), None)
    if found is None:
        raise NotFound("Nothing was confirmed for this solution.", field="titrant")
    reason = read_reason(
        command.reason, says="Give the reason.", example="classified anew, confirmation follows"
    )
    _keep(row, [one for one in kept if one is not found])
    session.flush()
    body = asdict(found)
    note_act(
        session, "withdrew hazards for labels", _thing(row), actor=actor, now=now, why=reason,
        body=body,
    )  # fmt: skip
    return row.revision


def _row(session: Session, revision: int) -> Laboratory:
    row = laboratory_row(session)
    session.refresh(row, with_for_update=True)
    if row.revision != revision:
        says = "Somebody else changed the settings meanwhile; look again."
        standing = {"revision": row.revision}
        raise SavedFirst(says, field="revision", shown={"standing": standing})
    return row


def _keep(row: Laboratory, hazards: list[SolutionHazards]) -> None:
    kept: list[dict[str, Any]] = [
        {**asdict(one), "pictograms": list(one.pictograms), "statements": list(one.statements)}
        for one in sorted(hazards, key=lambda one: (one.titrant, one.nominal, one.medium))
    ]
    row.settings = {**row.settings, "label_hazards": kept}
    row.revision += 1


def _same(one: SolutionHazards, other: SolutionHazards) -> bool:
    return one.is_of(other.titrant, other.nominal, other.medium)


def _nominal(text: str) -> str:
    try:
        read_wire_decimal(text.strip(), "nominal")
        number = read_typed_decimal(text.strip(), "nominal")
    except DecimalProblem as problem:
        raise Unacceptable(problem.says, field="nominal", example="0.1") from problem
    if number <= 0:
        raise Unacceptable("nominal must be more than zero.", field="nominal", example="0.1")
    return text.strip()


def _thing(row: Laboratory) -> Thing:
    return Thing("laboratory", LABORATORY_ID, row.name)
