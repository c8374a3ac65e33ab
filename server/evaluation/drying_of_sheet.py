"""The drying of a standard as its finding needs it: from the sheet's row, or the lot's log."""

from datetime import datetime

from server.evaluation.circumstances import Drying
from server.lab.in_use import is_mass
from server.lab.ink import WrittenEntry, standing
from server.lab.log_lines import standing_lines
from server.lab.lot_log import (
    DRYING,
    demand_of,
    drying_of,
    is_drying_step,
    judge_lot_drying,
    last_drying,
    logged_words,
)
from server.lab.sheet_facts import SheetFacts


def drying_of_sheet(facts: SheetFacts) -> Drying | None:
    """Return the drying as it was written on the sheet, or as the lot's log holds it."""
    lot = facts.standard_lot
    demand = demand_of(lot.document) if lot else None
    if lot is None or (lot.document.get("basis") != "dried" and demand is None):
        return None
    used = _weighed_at(facts)
    row = _row(facts)
    line = last_drying(lot.log, before=used[0], as_of=facts.log_as_of)
    logged = logged_words(line, facts.laboratory.zone) if line else None
    told = (row.text if row else None, logged if not row or logged != row.text else None)
    both = "; log: ".join(one for one in told if one)
    stated = str(lot.document.get("drying") or "")
    if demand is None or (line is None and row is not None):
        words = stated or (demand.words if demand else "dried, as its certificate says")
        return Drying(required=words, recorded=both or None)
    check = judge_lot_drying(lot, used_at=used, as_of=facts.log_as_of)
    verdict, says = (check.verdict, check.says) if check else ("look", "")
    if verdict == "fails" and demand.oven and (row or lot.document.get("basis") != "dried"):
        verdict = "look"
        says += f" The sheet says: {row.text}." if row else ""
    return Drying(stated or demand.words, both or None, verdict, says)


def _row(facts: SheetFacts) -> WrittenEntry | None:
    """Return what was written in the sheet's row of drying, None where there is none."""
    written = standing(facts.entries).items()
    found = [entry for place, entry in written if place[0] == 0 and is_drying_step(place[1])]
    return found[0] if found else None


def _weighed_at(facts: SheetFacts) -> tuple[datetime, ...]:
    """Return the first and the last weighing of the standard; before any, the latest drying."""
    masses = [one.received_at for one in standing(facts.entries).values() if is_mass(one.slot)]
    if masses:
        return min(masses), max(masses)
    lot = facts.standard_lot
    dried = standing_lines(lot.log, DRYING, as_of=facts.log_as_of) if lot else ()
    return (max((facts.begun_at, *(drying_of(one).ended_at for one in dried))),)
