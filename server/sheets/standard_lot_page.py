"""One standard lot with its life: certificate, end, drying, uses, what rests on it."""

from collections.abc import Iterable, Mapping, Sequence
from datetime import datetime
from typing import Any

from sqlalchemy.orm import Session

from server.lab.actor import Actor
from server.lab.calibration.check import Check
from server.lab.log_lines import standing_lines
from server.lab.lot_log import (
    COUNT,
    DRYING,
    OPENED,
    RETEST,
    USE,
    LotExpiry,
    demand_of,
    done_words,
    drying_of,
    expiry_of_lot,
    judge_lot_drying,
    opened_on,
)
from server.lab.lot_uses import Use, remaining_of, running_uses, taken_by_hand
from server.lab.roles import Act
from server.lab.sheet_facts import STANDARD_LOT, LogFact, StandardLotFact
from server.lab.states import due_state, sheet_state
from server.lab.validity import local_day, read_zone
from server.records.queries.list_holds import PastHold, hold_history, standing_holds
from server.records.queries.list_uses import SheetOnLot, sheets_on_lots, taken_on_sheets
from server.records.queries.load_files import FileFact, file_fact
from server.records.queries.load_papers import load_people
from server.records.queries.load_standard_lots import load_standard_lot_fact
from server.records.tables.stores import StandardLot
from server.sheets.parts.doors import may_hold, may_release, need_reader
from server.sheets.parts.shelf_state import held_says
from server.sheets.parts.telling import (
    day_words,
    due_words,
    last_day_words,
    moment_words,
    quantity_words,
    typed_day_words,
)
from server.sheets.standard_lots import (
    CheckView,
    FileView,
    LineView,
    RuleView,
    StandardLotPage,
    UsedOn,
    UseView,
)
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
    log = _Log(one, reader)
    opened = opened_on(one.log)
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
        file=_file(file_fact(session, row.file_id), zone),
        opened=day_words(opened) if opened else "",
        log=log.lines(OPENED, RETEST),
        drying_asked=asked_words(one.document),
        dryings=log.lines(DRYING),
        drying_now=_check(judge_lot_drying(one, used_at=(now,))),
        left=f"{remaining.left_g} g" if remaining else "",
        left_check=_check(remaining.check) if remaining else None,
        uses=tuple(reversed(_uses(uses, log, {used.sheet.id: used for used in sheets}))),
        sheets=tuple(_used_on(used, zone) for used in reversed(sheets)),
        holds=tuple(_hold_words(past, zone) for past in hold_history(session, STANDARD_LOT, one.id)),
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


def line_words(line: LogFact, zone: str) -> tuple[str, str]:
    """Return the day of a line of a lot's log, and what it says."""
    document = line.document
    if line.what == OPENED:
        return typed_day_words(document["day"]), "opened"
    if line.what == RETEST:
        says = f"re-tested: {document['says']}; next on {typed_day_words(document['next_on'])}"
        return typed_day_words(document["done_on"]), says
    if line.what == DRYING:
        done = drying_of(line)
        more = f"; {document['says']}" if document.get("says") else ""
        return moment_words(done.ended_at, zone), f"{done_words(done)}{more}"
    return moment_words(line.at, zone), str(document.get("says") or "")


class _Log:
    """The lines of one lot's log for one reader, the newest first."""

    def __init__(self, lot: StandardLotFact, reader: Actor) -> None:
        self._lines = {one.id: one for one in lot.log}
        self._zone = reader.zone
        self._may = {
            what: reader.may(Act.KEEP if what == RETEST else Act.LOG)
            for what in (OPENED, RETEST, DRYING, USE, COUNT)
        }

    def lines(self, *whats: str) -> tuple[LineView, ...]:
        """Return the lines of some kinds, struck ones among them."""
        found = [one for one in reversed(self._lines.values()) if one.what in whats]
        return tuple(self._view(one) for one in found)

    def struck(self, *whats: str) -> list[LogFact]:
        """Return the lines of some kinds that were struck through."""
        return [one for one in self._lines.values() if one.what in whats and one.struck]

    def struck_words(self, line_id: str | None) -> str:
        """Return who struck a line through, when and why; empty where it stands."""
        line = self._lines.get(line_id or "")
        if line is None or line.struck is None:
            return ""
        at = moment_words(line.struck.at, self._zone)
        return f"struck through by {line.struck.by.printed_name}, {at}: {line.struck.reason}"

    def may_strike(self, line_id: str | None) -> bool:
        """Say whether the reader may strike a line through."""
        line = self._lines.get(line_id or "")
        return line is not None and line.struck is None and self._may[line.what]

    def _view(self, line: LogFact) -> LineView:
        day, says = line_words(line, self._zone)
        return LineView(
            id=line.id,
            what=line.what,
            day=day,
            says=says,
            by=f"{line.by.printed_name}, {moment_words(line.at, self._zone)}",
            struck=self.struck_words(line.id),
            may_strike=self.may_strike(line.id),
        )


def _uses(uses: Sequence[Use], log: _Log, sheets: Mapping[str, SheetOnLot]) -> list[UseView]:
    """Return the uses in the order of time; a struck one stays where it was written."""
    views = [(one.taken.at, _use(one, log, sheets)) for one in uses]
    views += [(line.at, _struck_use(line, log)) for line in log.struck(USE, COUNT)]
    return [view for _, view in sorted(views, key=lambda one: one[0])]


def _use(one: Use, log: _Log, sheets: Mapping[str, SheetOnLot]) -> UseView:
    taken, used = one.taken, sheets.get(one.taken.sheet_id or "")
    return UseView(
        day=moment_words(taken.at, log._zone),  # noqa: SLF001 - this module's own
        what=taken.what or ("counted" if taken.counted else ""),
        name=used.sheet.number if used else "counted" if taken.counted else "by hand",
        url=f"/bench/{used.sheet.id}" if used else None,
        taken="" if taken.counted else f"{taken.mass_g} g",
        left="" if one.left_g is None else f"{one.left_g} g",
        below=one.left_g is not None and one.left_g < 0,
        by=taken.by,
        counted=taken.counted,
        line_id=taken.line_id,
        struck="",
        may_strike=log.may_strike(taken.line_id),
    )
