"""The log of a standard lot as it is read, what was struck through among it."""

from collections.abc import Mapping, Sequence

from server.lab.actor import Actor
from server.lab.lot_log import COUNT, DRYING, OPENED, RETEST, USE, done_words, drying_of
from server.lab.lot_uses import Use
from server.lab.roles import Act
from server.lab.sheet_facts import LogFact, StandardLotFact
from server.records.queries.list_uses import SheetOnLot
from server.sheets.parts.sheet_lines import sheet_url, state_of_sheet
from server.sheets.parts.telling import moment_words, typed_day_words
from server.sheets.standard_lots import LineView, UseView


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


class LotLog:
    """The lines of one lot's log for one reader, the newest first."""

    def __init__(self, lot: StandardLotFact, reader: Actor) -> None:
        self._lines = {one.id: one for one in lot.log}
        self.zone = reader.zone
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
        at = moment_words(line.struck.at, self.zone)
        return f"struck through by {line.struck.by.printed_name}, {at}: {line.struck.reason}"

    def may_strike(self, line_id: str | None) -> bool:
        """Say whether the reader may strike a line through."""
        line = self._lines.get(line_id or "")
        return line is not None and line.struck is None and self._may[line.what]

    def _view(self, line: LogFact) -> LineView:
        day, says = line_words(line, self.zone)
        return LineView(
            id=line.id,
            what=line.what,
            day=day,
            says=says,
            by=f"{line.by.printed_name}, {moment_words(line.at, self.zone)}",
            struck=self.struck_words(line.id),
            may_strike=self.may_strike(line.id),
        )


def use_views(uses: Sequence[Use], log: LotLog, sheets: Mapping[str, SheetOnLot]) -> list[UseView]:
    """Return the uses in the order of time; a struck one stays where it was written."""
    views = [(one.taken.at, _use(one, log, sheets)) for one in uses]
    views += [(line.at, _struck_use(line, log)) for line in log.struck(USE, COUNT)]
    return [view for _, view in sorted(views, key=lambda one: one[0])]


def _use(one: Use, log: LotLog, sheets: Mapping[str, SheetOnLot]) -> UseView:
    taken, used = one.taken, sheets.get(one.taken.sheet_id or "")
    return UseView(
        day=moment_words(taken.at, log.zone),
        what=taken.what or ("counted" if taken.counted else ""),
        name=used.sheet.number if used else "counted" if taken.counted else "by hand",
        url=sheet_url(used.sheet, state_of_sheet(used.sheet)) if used else None,
        taken="" if taken.counted else f"{taken.mass_g} g",
        left="" if one.left_g is None else f"{one.left_g} g",
        below=one.left_g is not None and one.left_g < 0,
        by=taken.by,
        counted=taken.counted,
        line_id=taken.line_id,
        struck="",
        may_strike=log.may_strike(taken.line_id),
    )


def _struck_use(line: LogFact, log: LotLog) -> UseView:
    counted = line.what == COUNT
    return UseView(
        day=moment_words(line.at, log.zone),
        what=str(line.document.get("says") or ""),
        name="counted" if counted else "by hand",
        url=None,
        taken=f"{line.document['mass_g']} g",
        left="",
        below=False,
        by=line.by.printed_name,
        counted=counted,
        line_id=line.id,
        struck=log.struck_words(line.id),
        may_strike=False,
    )
