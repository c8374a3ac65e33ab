"""One bench sheet as the bench page's script gets it."""

from collections.abc import Iterator
from dataclasses import replace
from datetime import datetime

from sqlalchemy.orm import Session

from server.chemistry.cautions import DEFERRAL
from server.evaluation.from_sheet import PreparedSheet, prepare_sheet
from server.lab.actor import Actor
from server.lab.in_use import things_in_use
from server.lab.ink import CORRECTION_REASONS
from server.lab.roles import Act
from server.lab.sheet_facts import SheetFacts, StandardLotFact
from server.lab.states import OPEN, SENT_BACK
from server.records.queries.list_sheets import snapshots_of
from server.records.queries.load_sheet import load_sheet_facts
from server.sheets.bench import BenchSheet, ReturnView
from server.sheets.parts.doors import may_read_number, need_reader
from server.sheets.parts.integrity import altered_says
from server.sheets.parts.margin import margin_of, margin_withheld
from server.sheets.parts.returned import return_views
from server.sheets.parts.roots import caution_views, rests_on
from server.sheets.parts.rows import groups_of, next_row
from server.sheets.parts.sheet_lines import sheet_title
from server.sheets.parts.signed import signature_views
from server.sheets.parts.telling import moment_words


def open_bench_sheet(
    session: Session, sheet_id: str, *, actor: Actor | None, now: datetime
) -> BenchSheet:
    """Return a bench sheet with all its rows, what was written, and what is missing.

    Raises:
        NotFound: there is no such sheet.
        NotSignedIn: a visitor.
    """
    del now
    reader = need_reader(actor)
    facts = load_sheet_facts(session, sheet_id)
    sheet = bench_sheet(facts, prepare_sheet(facts), snapshots_of(session, facts.id), reader)
    if facts.state in {OPEN, SENT_BACK}:
        return sheet  # asked for after every entry: what was signed has not come yet
    return replace(sheet, altered=altered_says(session, facts.id))


def bench_sheet(
    facts: SheetFacts, prepared: PreparedSheet, snapshots: dict[str, str], reader: Actor
) -> BenchSheet:
    """Return a sheet that was loaded and prepared, for one reader."""
    zone, lot = facts.laboratory.zone, facts.lot
    groups = groups_of(facts)
    missing = tuple(_missing(facts, prepared))
    writable = facts.state in {OPEN, SENT_BACK} and not lot.pulled
    may_write = writable and reader.may(Act.WRITE)
    begun = moment_words(facts.begun_at, zone)
    return BenchSheet(
        id=facts.id,
        number=facts.number,
        state=facts.state,
        revision=facts.revision,
        title=sheet_title(lot.titrant, lot.nominal),
        against=against(facts),
        lot_code=lot.code,
        lot_name=lot.name,
        recipe=f"{facts.recipe.name}, version {facts.recipe.version}",
        begun=f"begun {begun} by {facts.begun_by.printed_name}",
        rests_on=rests_on(facts),
        cautions=caution_views(substances_of(facts)),
        deferral=DEFERRAL,
        groups=groups,
        next=next_row(groups) if may_write else None,
        margin=(
            margin_of(facts, prepared, groups)
            if may_read_number(reader, facts.state)
            else margin_withheld()
        ),
        missing=missing,
        correction_reasons=CORRECTION_REASONS,
        may_write=may_write,
        may_hand_in=writable and not missing and reader.may(Act.HAND_IN),
        sent_back_remark=facts.sent_back_remark if facts.state == SENT_BACK else None,
        signatures=signature_views(facts, snapshots),
        sent_back=_sent_back(facts),
    )


def _sent_back(facts: SheetFacts) -> ReturnView | None:
    """Return what was said when the sheet was sent back last, while that is not answered."""
    views = return_views(facts) if facts.state in {OPEN, SENT_BACK} else ()
    return views[-1] if views else None


def against(facts: SheetFacts) -> str:
    """Return the lot, the standard and the instruments in one line."""
    recipe = facts.recipe.document
    parts = [f"lot {facts.lot.name}"]
    if facts.standard_lot is not None:
        parts.append(f"against {standard_words(facts.standard_lot)}")
    parts += [one.name for one in facts.instruments]
    if recipe.end_point.indicator:
        parts.append(f"indicator {recipe.end_point.indicator}")
    if recipe.end_point.method:
        parts.append(f"curve, {recipe.end_point.method}")
    return " · ".join(parts)


def standard_words(lot: StandardLotFact) -> str:
    """Return a standard lot with its substance, said once."""
    named = lot.name.startswith(lot.substance)
    return lot.name if named else f"{lot.substance}, lot {lot.name}"


def substances_of(facts: SheetFacts) -> tuple[str, ...]:
    """Return the substances that somebody handles for a sheet, by key."""
    return facts.lot.titrant, facts.recipe.document.standard


def _missing(facts: SheetFacts, prepared: PreparedSheet) -> Iterator[str]:
    """Yield what keeps the sheet from being handed in: rows first, then what was not valid."""
    for one in prepared.missing:
        yield one.says
    for thing in things_in_use(facts):
        if thing.blocks:
            yield f"{thing.says} A keeper may let it be used with a reason."
    if facts.lot.pulled:
        yield "This lot was pulled: it is out of use for good."
