"""Beginning a bench sheet, letting something out of date be used, abandoning."""

from dataclasses import dataclass, replace
from datetime import date, datetime
from decimal import Decimal
from typing import Any
from uuid import uuid4

from sqlalchemy.orm import Session

from server.chemistry.substances import SUBSTANCES
from server.lab.actor import Actor
from server.lab.calibration.check_log import CHECK_OF_KIND
from server.lab.codes import read_code
from server.lab.free_text import MOST_REASON, read_reason, read_text
from server.lab.in_use import judge, off_limits, things_in_use
from server.lab.recipe import RecipeDocument
from server.lab.refusal import NotAllowed, NotFound, Stale, Unacceptable
from server.lab.roles import Act
from server.lab.sheet_facts import (
    BALANCE,
    BURETTE,
    PROBE,
    ROOM,
    THERMOMETER,
    InstrumentFact,
    RecipeFact,
    StandardLotFact,
)
from server.lab.states import IN_DATE, OPEN, SENT_BACK
from server.lab.validity import local_day
from server.procedures.acts import Thing, note_act
from server.records.queries.list_stores import CHECK_SPAN, checks_since
from server.records.queries.load_lots import lot_is_pulled, lot_of_code
from server.records.queries.load_papers import (
    load_instrument_fact,
    load_recipe_fact,
)
from server.records.queries.load_sheet import load_sheet_facts
from server.records.queries.load_standard_lots import load_standard_lot_fact
from server.records.queries.loading import (
    newest_calibration,
    newest_recipe_version,
    next_number,
)
from server.records.tables.bench import Sheet
from server.records.tables.lots import Lot
from server.records.tables.stores import Instrument

_FIELDS = {
    BALANCE: "balance_id",
    BURETTE: "burette_id",
    THERMOMETER: "thermometer_id",
    ROOM: "room_id",
    PROBE: "probe_id",
}


@dataclass(frozen=True, slots=True)
class BeginSheet:
    """A new bench sheet: what is standardized, how, and with what.

    ``lot_code`` may be the code of one of its bottles. ``probe_id`` is the probe of a
    potentiometric end point, where a pH probe is used. ``override_reason`` is a keeper's reason to
    use something that is out of date, held, or failed its last check.
    """

    lot_code: str
    recipe_id: str
    standard_lot_id: str
    balance_id: str
    burette_id: str
    thermometer_id: str | None = None
    room_id: str | None = None
    probe_id: str | None = None
    override_reason: str | None = None


@dataclass(frozen=True, slots=True)
class LetBeUsed:
    """A keeper's word that a thing of an open sheet may be used out of date.

    ``what``: standard lot, balance, burette, thermometer or room monitor.
    """

    sheet_id: str
    what: str
    reason: str


@dataclass(frozen=True, slots=True)
class AbandonSheet:
    """A sheet that is not finished; it stays readable."""

    sheet_id: str
    reason: str


def begin_sheet(session: Session, command: BeginSheet, *, actor: Actor, now: datetime) -> str:
    """Begin a bench sheet; return its id.

    An analyst begins; a keeper may begin one for which something out of date has to be let.

    Raises:
        Unacceptable: the recipe does not fit the lot, or something is missing or not valid.
    """
    reason = read_text(command.override_reason or "", "override_reason", most=MOST_REASON)
    if not (reason and actor.may(Act.OVERRIDE)):
        actor.need(Act.WRITE)
    lot = _lot(session, command.lot_code, today=local_day(now, actor.zone))
    recipe = load_recipe_fact(session, command.recipe_id)
    _check_recipe(session, recipe, lot)
    standard = load_standard_lot_fact(session, command.standard_lot_id)
    if standard.substance != recipe.document.standard:
        says = f"The recipe weighs {recipe.document.standard}; {standard.name} is another standard."
        raise Unacceptable(says, field="standard_lot_id")
    _check_density(standard, recipe.document)
    instruments = _instruments(session, command, recipe.document, now=now)
    overrides = _overrides(standard, instruments, reason, actor=actor, now=now)
    if not overrides:
        actor.need(Act.WRITE)
    sheet = Sheet(
        id=str(uuid4()),
        number=_number(session, actor, now),
        lot_id=lot.id,
        recipe_id=recipe.id,
        standard_lot_id=standard.id,
        calibrations={one.kind: one.calibration_id for one in instruments},
        overrides=overrides,
        begun_by=actor.person_id,
        begun_at=now,
    )
    session.add(sheet)
    session.flush()
    body = {
        "lot": lot.name,
        "recipe": f"{recipe.name}, version {recipe.version}",
        "standard_lot": standard.name,
        "instruments": [f"{one.name}, calibration {one.version}" for one in instruments],
        "overrides": overrides,
    }
    thing = Thing("sheet", sheet.id, sheet.number)
    why = reason if overrides else None
    note_act(session, "began a bench sheet", thing, actor=actor, now=now, why=why, body=body)
    return sheet.id


def let_be_used(session: Session, command: LetBeUsed, *, actor: Actor, now: datetime) -> int:
    """Let something of an open sheet be used out of date; return the sheet's new revision."""
    actor.need(Act.OVERRIDE)
    sheet = lock_sheet(session, command.sheet_id)
    facts = load_sheet_facts(session, sheet.id)
    if facts.state not in {OPEN, SENT_BACK}:
        raise NotAllowed(f"This sheet is {facts.state}.")
    things = {one.kind: one for one in things_in_use(facts, at=now)}
    if command.what not in things:
        says = f"This sheet uses no “{command.what[:40]}”; it uses {', '.join(things)}."
        raise Unacceptable(says, field="what", example=next(iter(things), None))
    reason = read_reason(
        command.reason,
        says="Give the reason; it is printed on the certificate.",
        example="checked with the daily weight today",
    )
    one = _override(command.what, reason, actor=actor, now=now)
    sheet.overrides = [*sheet.overrides, one]
    sheet.revision += 1
    session.flush()
    body = {"what": command.what, "name": things[command.what].name}
    thing = Thing("sheet", sheet.id, sheet.number)
    note_act(
        session, "let something out of date be used", thing,
        actor=actor, now=now, why=reason, body=body,
    )  # fmt: skip
    return sheet.revision


def abandon_sheet(session: Session, command: AbandonSheet, *, actor: Actor, now: datetime) -> None:
    """Abandon a sheet; nothing of it is certified, everything stays readable."""
    actor.need(Act.WRITE)
    sheet = lock_sheet(session, command.sheet_id)
    state = load_sheet_facts(session, sheet.id).state
    if state not in {OPEN, SENT_BACK}:
        raise NotAllowed(f"This sheet is {state}; only an open one can be abandoned.")
    why = read_reason(
        command.reason,
        says="Give the reason; the sheet stays readable.",
        example="burette leaked",
    )
    sheet.abandoned_at = now
    sheet.revision += 1
    session.flush()
    thing = Thing("sheet", sheet.id, sheet.number)
    note_act(session, "abandoned a bench sheet", thing, actor=actor, now=now, why=why)


def lock_sheet(session: Session, sheet_id: str) -> Sheet:
    """Return a sheet's row, locked until the commit.

    Raises:
        NotFound: there is no such sheet.
    """
    sheet = session.get(Sheet, sheet_id, with_for_update=True)
    if sheet is None:
        raise NotFound("There is no such bench sheet.", field="sheet_id")
    return sheet


def need_revision(sheet: Sheet, revision: int) -> None:
    """Refuse an act that was decided on an older state of the sheet."""
    if sheet.revision != revision:
        says = "This sheet has changed since you looked at it; look again before you sign."
        shown = {"seen": revision, "standing": sheet.revision}
        raise Stale(says, field="revision", shown=shown)


def _lot(session: Session, code: str, *, today: date) -> Lot:
    lot = lot_of_code(session, read_code(code))
    if lot is None:
        raise NotFound(f"There is no lot or bottle {code[:40]}.", field="lot_code")
    if lot_is_pulled(session, lot.id):
        raise NotAllowed("This lot was pulled: it is out of use for good.", field="lot_code")
    use_by = lot.document.get("use_by")
    if use_by and date.fromisoformat(use_by) < today:
        says = f"This lot's use-by day, {use_by}, is past: no certificate of it would be valid."
        raise NotAllowed(says, field="lot_code")
    return lot


def _check_recipe(session: Session, recipe: RecipeFact, lot: Lot) -> None:
    document = recipe.document
    if document.route != "weighed":
        says = "Sheets by aliquot or against a titrant are not written here yet; weigh a standard."
        raise Unacceptable(says, field="recipe_id")
    if recipe.version != newest_recipe_version(session, recipe.name):
        says = f"“{recipe.name}” has a newer version; begin with that one."
        raise Unacceptable(says, field="recipe_id")
    fits = (
        document.titrant.substance == lot.titrant
        and Decimal(document.titrant.nominal) == Decimal(lot.nominal)
        and document.titrant.medium == lot.medium
    )
    if not fits:
        says = (
            f"“{recipe.name}” is for {document.titrant.substance} {document.titrant.nominal} mol/L "
            f"in {document.titrant.medium}; this lot is {lot.titrant} {lot.nominal} mol/L in "
            f"{lot.medium}."
        )
        raise Unacceptable(says, field="recipe_id")


def _check_density(standard: StandardLotFact, recipe: RecipeDocument) -> None:
    """Refuse before the work what could not be evaluated after it."""
    known = SUBSTANCES.get(standard.substance)
    in_table = known is not None and known.density_g_cm3 is not None
    if recipe.buoyancy and not in_table and "density" not in standard.document:
        says = (
            f"The recipe corrects for buoyancy, and the density of {standard.substance} is in no "
            f"table: a keeper states it for a standard lot; {standard.name} has none."
        )
        raise Unacceptable(says, field="standard_lot_id")


def _instruments(
    session: Session, command: BeginSheet, recipe: RecipeDocument, *, now: datetime
) -> tuple[InstrumentFact, ...]:
    wanted = {BALANCE: command.balance_id, BURETTE: command.burette_id}
    wanted[THERMOMETER] = command.thermometer_id or ""
    if recipe.buoyancy:
        wanted[ROOM] = command.room_id or ""
    if command.probe_id:
        if recipe.end_point.mode != "potentiometric":
            says = "This recipe's end point is seen, not measured: it takes no probe."
            raise Unacceptable(says, field="probe_id")
        wanted[PROBE] = command.probe_id
    found = [_instrument(session, kind, key) for kind, key in wanted.items()]
    checked = [one.instrument_id for one in found if one.kind in CHECK_OF_KIND]
    logs = checks_since(session, checked, now - CHECK_SPAN)
    return tuple(replace(one, log=logs.get(one.instrument_id, ())) for one in found)


def _instrument(session: Session, kind: str, instrument_id: str) -> InstrumentFact:
    field = _FIELDS[kind]
    if not instrument_id:
        why = "the air at the balance" if kind == ROOM else "this recipe's readings"
        raise Unacceptable(f"Pick the {kind}: it is needed for {why}.", field=field)
    row = session.get(Instrument, instrument_id)
    if row is None or row.kind != kind:
        raise Unacceptable(f"There is no such {kind}.", field=field)
    calibration = newest_calibration(session, row.id)
    if calibration is None:
        says = f"{row.name} has no calibration yet; a keeper records one."
        raise Unacceptable(says, field=field)
    return load_instrument_fact(session, calibration.id)


def _overrides(
    standard: StandardLotFact,
    instruments: tuple[InstrumentFact, ...],
    reason: str,
    *,
    actor: Actor,
    now: datetime,
) -> list[dict[str, Any]]:
    """Return a keeper's words for all that is not valid now; refuse where there are none."""
    things: list[tuple[str, str, StandardLotFact | InstrumentFact]] = [
        ("standard lot", "standard_lot_id", standard)
    ]
    things += [(one.kind, _FIELDS[one.kind], one) for one in instruments]
    words = []
    for kind, field, thing in things:
        what = "certificate" if kind == "standard lot" else "calibration"
        state, says = judge(
            thing.name, due_at=thing.due_at, basis=thing.due_basis, holds=thing.holds,
            used_at=now, zone=actor.zone, what=what,
        )  # fmt: skip
        stopped = (
            "" if isinstance(thing, StandardLotFact) else off_limits(thing, at=now, zone=actor.zone)
        )
        if state == IN_DATE and not stopped:
            continue
        says = " ".join(part for part in ("" if state == IN_DATE else says, stopped) if part)
        if not (reason and actor.may(Act.OVERRIDE)):
            says += " A keeper may let it be used and gives the reason."
            raise Unacceptable(says, field=field)
        words.append(_override(kind, reason, actor=actor, now=now))
    return words


def _override(what: str, reason: str, *, actor: Actor, now: datetime) -> dict[str, Any]:
    return {"what": what, "reason": reason, "by": actor.person_id, "at": now.isoformat()}


def _number(session: Session, actor: Actor, now: datetime) -> str:
    year = local_day(now, actor.zone).year
    return f"S-{year}-{next_number(session, f'sheet {year}'):04d}"
