"""One standard lot with its life: certificate, end, drying, uses, what rests on it."""

from collections.abc import Mapping
from datetime import datetime
from typing import Any

from sqlalchemy.orm import Session

from server.lab.actor import Actor
from server.lab.calibration.check import Check
from server.lab.lot_log import (
    DRYING,
    OPENED,
    RETEST,
    LotExpiry,
    demand_of,
    expiry_of_lot,
    judge_lot_drying,
    opened_on,
)
from server.lab.lot_uses import remaining_of, running_uses, taken_by_hand
from server.lab.roles import Act
from server.lab.sheet_facts import STANDARD_LOT, StandardLotFact
from server.lab.states import due_state
from server.lab.validity import local_day, read_zone
from server.records.queries.list_holds import hold_history, standing_holds
from server.records.queries.list_uses import SheetOnLot, sheets_on_lots, taken_on_sheets
from server.records.queries.load_files import file_fact
from server.records.queries.load_papers import load_people
from server.records.queries.load_standard_lots import load_standard_lot_fact
from server.records.tables.stores import StandardLot
from server.sheets.parts.doors import may_hold, may_release, need_reader
from server.sheets.parts.kept_files import file_view
from server.sheets.parts.lot_log import LotLog, use_views
from server.sheets.parts.past_holds import hold_words
from server.sheets.parts.sheet_lines import sheet_url, state_of_sheet
from server.sheets.parts.shelf_state import held_says
from server.sheets.parts.telling import (
    day_words,
    due_words,
    last_day_words,
    moment_words,
    quantity_words,
    typed_day_words,
)
from server.sheets.standard_lots import CheckView, RuleView, StandardLotPage, UsedOn
from server.sheets.stores import Fact


def open_standard_lot(
    session: Session, standard_lot_id: str, *, actor: Actor | None, now: datetime
) -> StandardLotPage:
    """Return one standard lot: what its certificate states, its logs, and where it was used.

    Raises:
        NotFound: there is no such standard lot.
        NotSignedIn: a visitor.
    """
    reader = need_reader(actor)
    zone, one = reader.zone, load_standard_lot_fact(session, standard_lot_id)
    row = session.get_one(StandardLot, one.id)
    hold = standing_holds(session, (STANDARD_LOT,), thing_ids=(one.id,)).get((STANDARD_LOT, one.id))
    by = load_people(session, (row.made_by,))[row.made_by].printed_name
    sheets = sheets_on_lots(session, (one.id,)).get(one.id, ())
    uses = running_uses(one.document, (*taken_on_sheets(sheets), *taken_by_hand(one.log)))
    remaining = remaining_of(one.document, uses)
    ends = expiry_of_lot(one.document, (row.due_at, row.due_basis), one.log, zone=zone)
    log, pasts = LotLog(one, reader), hold_history(session, STANDARD_LOT, one.id)
    opened, original = opened_on(one.log), file_fact(session, row.file_id)
    return StandardLotPage(
        id=one.id,
        name=one.name.removeprefix(f"{one.substance}, lot "),
        substance=one.substance,
        state=state_of_standard_lot(one, now),
        held_says=held_says(hold, STANDARD_LOT, zone),
        due=last_day_words(one.due_at, zone),
        due_in=due_words(one.due_at, now, zone),
        due_rule=one.due_basis,
        rules=_rules(ends),
        facts=(*_stated(one), *_in_the_store(one, f"{moment_words(row.made_at, zone)} by {by}")),
        file=file_view(original, zone) if original else None,
        opened=day_words(opened) if opened else "",
        log=log.lines(OPENED, RETEST),
        drying_asked=asked_words(one.document),
        dryings=log.lines(DRYING),
        drying_now=_check(judge_lot_drying(one, used_at=(now,))),
        left=f"{remaining.left_g} g" if remaining else "",
        left_check=_check(remaining.check) if remaining else None,
        uses=tuple(reversed(use_views(uses, log, {used.sheet.id: used for used in sheets}))),
        sheets=tuple(_used_on(used, zone) for used in reversed(sheets)),
        holds=tuple(hold_words(past, zone) for past in pasts),
        now_local=f"{now.astimezone(read_zone(zone)):%Y-%m-%dT%H:%M}",
        today=local_day(now, zone).isoformat(),
        may_keep=reader.may(Act.KEEP),
        may_log=reader.may(Act.LOG),
        may_hold=may_hold(reader, hold),
        may_release=may_release(reader, hold),
    )


def state_of_standard_lot(one: StandardLotFact, now: datetime) -> str:
    """Return a standard lot's state: in date, due soon, lapsed or held."""
    held = any(hold.released_at is None for hold in one.holds)
    return due_state(due_at=one.due_at, held=held, now=now)


def asked_words(document: Mapping[str, Any]) -> str:
    """Return what a certificate asks for before its standard is weighed, empty where nothing."""
    demand = demand_of(document)
    words = str(document.get("drying") or "")
    if demand is None:
        return words
    return f"{words} ({demand.words})" if words and words != demand.words else demand.words


def _rules(ends: LotExpiry) -> tuple[RuleView, ...]:
    return tuple(
        RuleView(rule=rule, day=day_words(day), sets=rule == ends.basis)
        for rule, day in sorted(ends.candidates, key=lambda one: one[1])
    )


def _stated(one: StandardLotFact) -> list[Fact]:
    """Return what the certificate states."""
    held = one.document
    facts = (
        Fact("Substance", one.substance),
        Fact("Certificate", one.certificate_number),
        Fact("Issued by", one.issuer),
        Fact("Mass fraction", quantity_words(held.get("mass_fraction"))),
        Fact("Holds for the substance", str(held.get("basis", ""))),
        Fact("Drying", asked_words(held)),
        Fact("Molar mass", quantity_words(held.get("molar_mass"))),
        Fact("Density", quantity_words(held.get("density"))),
        Fact("Smallest sample", _grams(held, "minimum_sample_g")),
    )
    return [fact for fact in facts if fact.value]


def _in_the_store(one: StandardLotFact, written: str) -> list[Fact]:
    """Return what the laboratory wrote beside it."""
    held = one.document
    facts = (
        Fact("Came", _grams(held, "received_g")),
        Fact("Received", typed_day_words(held.get("received_on"))),
        Fact("Kept", str(held.get("storage") or "")),
        Fact("Good after opening for", str(held.get("period_after_opening") or "")),
        Fact("Written", written),
    )
    return [fact for fact in facts if fact.value]


def _grams(held: Mapping[str, Any], key: str) -> str:
    return f"{held[key]} g" if held.get(key) else ""


def _check(check: Check | None) -> CheckView | None:
    return None if check is None else CheckView(check.verdict, check.says, check.basis)


def _used_on(used: SheetOnLot, zone: str) -> UsedOn:
    row = used.sheet
    state = state_of_sheet(row)
    return UsedOn(
        number=row.number,
        url=sheet_url(row, state),
        begun=f"{moment_words(row.begun_at, zone)} by {used.begun_by}",
        state=state,
        certificate=used.certificate or "",
        certificate_url=f"/certificates/{used.certificate}" if used.certificate else "",
    )
