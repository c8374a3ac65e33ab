"""What a countersigner said when a sheet was sent back, at its rows and as a whole."""

from server.lab.ink import Place
from server.lab.rig import rig_of
from server.lab.sheet_facts import ReturnFact, SheetFacts
from server.lab.slots import place_words, row_at
from server.sheets.bench import RemarkView, ReturnView
from server.sheets.parts.telling import moment_words


def remarks_on_rows(facts: SheetFacts) -> dict[Place, list[RemarkView]]:
    """Return all remarks on rows, of every time that the sheet was sent back, oldest first."""
    found: dict[Place, list[RemarkView]] = {}
    for one in facts.returns:
        at = moment_words(one.at, facts.laboratory.zone)
        for row in one.rows:
            place = (row.replicate, row.slot, row.segment)
            found.setdefault(place, []).append(RemarkView(row.text, one.by, at))
    return found


def return_views(facts: SheetFacts) -> tuple[ReturnView, ...]:
    """Return every time that a sheet was sent back, oldest first."""
    return tuple(_view(facts, one) for one in facts.returns)


def _view(facts: SheetFacts, one: ReturnFact) -> ReturnView:
    recipe, rig = facts.recipe.document, rig_of(facts.instruments)
    return ReturnView(
        by=one.by,
        at=one.at.isoformat(),
        says_at=moment_words(one.at, facts.laboratory.zone),
        remark=one.remark,
        rows=tuple(
            (
                place_words(
                    row.replicate, row_at(recipe, rig, (row.replicate, row.slot, row.segment)).label
                ),
                row.text,
            )
            for row in one.rows
        ),
    )
