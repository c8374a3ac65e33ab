"""The page on which the end-point methods of a lot are compared over its sheets."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from datetime import datetime

from sqlalchemy.orm import Session

from server.evaluation.circumstances import Limits
from server.evaluation.methods_compared import (
    SheetOutcome,
    StatedValue,
    compare_sheets,
    outcome_of,
)
from server.lab.actor import Actor
from server.lab.calibration.typed_numbers import read_number
from server.lab.refusal import NotFound, Unacceptable
from server.lab.sheet_facts import SheetFacts
from server.lab.states import COUNTERSIGNED
from server.records.queries.list_sheets import ListedSheet, sheets_of_lot
from server.records.queries.load_sheet import load_many_sheet_facts
from server.sheets.methods import MethodsPage, SheetChoice
from server.sheets.parts.by_code import find_lot
from server.sheets.parts.comparison_view import MARGIN, comparison_view
from server.sheets.parts.doors import need_reader
from server.sheets.parts.outcome import printed
from server.sheets.parts.sheet_lines import lot_words, sheet_url, state_of_sheet

_EXAMPLE, _EXAMPLE_U = "0.10214", "0.00020"
_REFERENCE, _REFERENCE_U = "reference", "reference_U"


@dataclass(frozen=True, slots=True)
class MethodsAsked:
    """What somebody wants compared: sheets by number (none: all), and a value to be true to.

    ``reference`` and ``reference_U`` are mol/L as typed, U with k = 2.
    """

    sheets: tuple[str, ...] = ()
    reference: str = ""
    reference_U: str = ""


def open_methods(
    session: Session, code: str, asked: MethodsAsked, *, actor: Actor | None, now: datetime
) -> MethodsPage:
    """Return the end-point methods of a lot compared over its certified sheets.

    Raises:
        NotFound: no lot has this code, or the lot no sheet of a number that was asked for.
        Unacceptable: the reference is none.
        NotSignedIn: a visitor.
    """
    del now
    need_reader(actor)
    lot = find_lot(session, code)
    listed = sheets_of_lot(session, lot.id)
    _check_numbers(asked.sheets, {one.sheet.number for one in listed})
    facts = load_many_sheet_facts(session, [one.sheet.id for one in listed])
    certified = [one for one in facts if one.state == COUNTERSIGNED]
    outcomes = {one.number: read for one in certified if (read := outcome_of(one)) is not None}
    chosen = [one for number, one in outcomes.items() if _is_chosen(number, asked)]
    limits = _strictest(chosen)
    found = compare_sheets(
        chosen,
        margin_percent=limits.method_margin_percent,
        reference=_reference(asked),
    )
    return MethodsPage(
        code=lot.code,
        name=lot.name,
        title=lot_words(lot),
        sheets=tuple(_choices(listed, facts, outcomes, asked)),
        reference=asked.reference,
        reference_U=asked.reference_U,
        comparison=comparison_view(found, margin_basis=limits.basis(MARGIN)),
    )


def _check_numbers(asked: Sequence[str], known: set[str]) -> None:
    for number in asked:
        if number not in known:
            says = f"This lot has no bench sheet {number[:40]}."
            raise NotFound(says, field="sheet", example=min(known, default=None))


def _is_chosen(number: str, asked: MethodsAsked) -> bool:
    return not asked.sheets or number in asked.sheets


def _strictest(sheets: Sequence[SheetOutcome]) -> Limits:
    """Return the limits of the sheet with the smallest margin: it holds for all of them."""
    limits = [one.limits for one in sheets]
    return min(limits, key=lambda one: one.method_margin_percent, default=Limits())


def _reference(asked: MethodsAsked) -> StatedValue | None:
    """Return the value to be true to; only U left empty is a value without uncertainty."""
    if not asked.reference.strip():
        if asked.reference_U.strip():
            says = "reference_U was given without a reference."
            raise Unacceptable(says, field=_REFERENCE, example=_EXAMPLE)
        return None
    value = _number(asked.reference, _REFERENCE, _EXAMPLE)
    if value == 0:
        says = "reference must be above zero."
        raise Unacceptable(says, field=_REFERENCE, example=_EXAMPLE)
    U = _number(asked.reference_U, _REFERENCE_U, _EXAMPLE_U) if asked.reference_U.strip() else 0.0
    return StatedValue(value, U / 2, "the stated value")


def _number(text: str, field: str, example: str) -> float:
    typed = text.strip().replace(",", ".") if "." not in text else text.strip()
    return float(read_number(typed, field, example=example, low="0", high="100"))


def _choices(
    listed: Sequence[ListedSheet],
    facts: Sequence[SheetFacts],
    outcomes: Mapping[str, SheetOutcome],
    asked: MethodsAsked,
) -> list[SheetChoice]:
    known = {one.id: one for one in facts}
    found = []
    for one in listed:
        state = state_of_sheet(one.sheet)
        outcome = outcomes.get(one.sheet.number)
        found.append(
            SheetChoice(
                number=one.sheet.number,
                says=_sheet_says(known[one.sheet.id], outcome),
                url=sheet_url(one.sheet, state),
                chosen=outcome is not None and _is_chosen(one.sheet.number, asked),
                refused="" if outcome else f"{state}: no certified result stands",
            )
        )
    return found


def _sheet_says(facts: SheetFacts, outcome: SheetOutcome | None) -> str:
    recipe = f"{facts.recipe.name}, version {facts.recipe.version}"
    if outcome is None:
        return recipe
    number = printed(outcome.result)
    return f"{number.value} ± {number.uncertainty} {number.unit} · {recipe}"
