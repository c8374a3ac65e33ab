"""Opening what was printed and what can be: the labels of a lot, of a bottle, of one print."""

from collections.abc import Sequence
from datetime import datetime

from sqlalchemy.orm import Session

from server.lab.actor import Actor
from server.lab.label_hazards import hazards_of
from server.lab.refusal import NotFound
from server.lab.roles import Act
from server.lab.sheet_facts import LaboratoryFact
from server.records.queries.list_labels import (
    PrintedLabel,
    labels_of_bottles,
    labels_of_print,
    last_labels,
)
from server.records.queries.list_shelf import (
    BottleOnShelf,
    bottles_of_lot,
    bottles_on_shelf,
    lot_on_shelf,
)
from server.records.queries.load_papers import load_laboratory_fact
from server.records.tables.lots import Lot
from server.sheets.labels import LabelJob, LabelLine, LabelsPage, PrintLine
from server.sheets.parts.by_code import as_code, find_lot
from server.sheets.parts.doors import need_reader
from server.sheets.parts.label_state import again_says, is_gone
from server.sheets.parts.sheet_lines import lot_words
from server.sheets.parts.telling import count_words, moment_words, typed_day_words

_MOST_PRINTS = 100


def open_labels(session: Session, thing: str, *, actor: Actor | None, now: datetime) -> LabelsPage:
    """Return the labels of a lot or bottle by its code; without a code those to be printed again.

    Raises:
        NotFound: nothing has this code.
        NotSignedIn: a visitor.
    """
    reader = need_reader(actor)
    laboratory = load_laboratory_fact(session)
    lot = find_lot(session, thing, field="thing") if thing.strip() else None
    shelf = bottles_of_lot(session, lot_on_shelf(session, lot.id)) if lot else _outdated(session)
    printed = labels_of_bottles(session, [one.bottle.id for one in shelf])
    code = as_code(thing)
    good = [one for one in shelf if not is_gone(one)]
    named = code if any(one.bottle.code == code for one in shelf) else ""
    return LabelsPage(
        thing=thing.strip(),
        title=f"Labels of {lot_words(lot)}" if lot else "Labels",
        lot_code=lot.code if lot else "",
        bottles=tuple(_line(one, printed, now, reader.zone, named) for one in good),
        no_label=", ".join(one.bottle.code for one in shelf if is_gone(one)),
        prints=tuple(_print_line(one, reader.zone) for one in printed[:_MOST_PRINTS]),
        value_says=_value_says(laboratory),
        hazards_says=_hazards_says(laboratory, lot) if lot else "",
        base_url=str(laboratory.settings.get("base_url") or ""),
        may_print=reader.may(Act.LABEL),
    )


def open_label_job(
    session: Session, number: int, *, actor: Actor | None, now: datetime
) -> LabelJob:
    """Return one print by its number.

    Raises:
        NotFound: no print has this number.
        NotSignedIn: a visitor.
    """
    del now
    reader = need_reader(actor)
    labels = labels_of_print(session, number)
    if not labels:
        raise NotFound(f"There is no print {number}.", field="number")
    first = labels[0]
    return LabelJob(
        number=number,
        made_at=first.at,
        says_at=moment_words(first.at, reader.zone),
        who=first.person_name,
        texts=tuple(one.text for one in labels),
        onto=first.stock,
        lines=tuple(
            {"code": one.text.code, "says": _says(one), "reason": one.text.reason} for one in labels
        ),
        lot_code=find_lot(session, first.text.code).code,
    )


def _outdated(session: Session) -> list[BottleOnShelf]:
    """Return the bottles whose last label bears a value that their certificate states no more."""
    last = {one.bottle_id: one for one in last_labels(session) if one.text.value is not None}
    if not last:
        return []
    found = [one for one in bottles_on_shelf(session) if one.bottle.id in last]
    return [one for one in found if not is_gone(one) and again_says(one, last[one.bottle.id])]


def _line(
    one: BottleOnShelf, printed: Sequence[PrintedLabel], now: datetime, zone: str, named: str
) -> LabelLine:
    own = [label for label in printed if label.bottle_id == one.bottle.id]
    state = one.state(now)
    last = own[0] if own else None
    again = again_says(one, last) if last else ""
    code = one.bottle.code
    return LabelLine(
        code=code,
        url=f"/b/{code}",
        lot_name=one.lot.lot.name,
        place=one.bottle.place,
        state=state,
        printed=_printed_words(own, zone),
        again=again,
        chosen=code == named if named else (last is None or bool(again)),
    )


def _printed_words(own: Sequence[PrintedLabel], zone: str) -> str:
    if not own:
        return "no label yet"
    times = count_words(len(own), "label")
    return f"{times}, last {moment_words(own[0].at, zone)} by {own[0].person_name}"


def _print_line(one: PrintedLabel, zone: str) -> PrintLine:
    return PrintLine(
        code=one.text.code,
        url=f"/labels/prints/{one.first_seq}",
        at=moment_words(one.at, zone),
        who=one.person_name,
        says=_says(one),
        reason=one.text.reason,
    )


def _says(one: PrintedLabel) -> str:
    """Return what a label bore besides code and nominal concentration."""
    value, hazards = one.text.value, one.text.hazards
    says = "no value"
    if value is not None:
        day = typed_day_words(value.valid_until)
        says = f"{value.reported}, {value.certificate}, valid until {day}"
    if hazards is not None:
        shown = [*hazards.pictograms, hazards.signal_word, *hazards.statements]
        says += f"; {', '.join(part for part in shown if part)}"
    return f"{says}; onto {one.stock.stock}"


def _value_says(laboratory: LaboratoryFact) -> str:
    if laboratory.settings.get("label_value"):
        return (
            "Labels bear the certified value of bottles in force, as this laboratory has chosen. "
            "When a certificate is replaced, print them again."
        )
    return "Labels bear the nominal concentration only; the value is behind their QR code."


def _hazards_says(laboratory: LaboratoryFact, lot: Lot) -> str:
    found = hazards_of(laboratory.settings, lot.titrant, lot.nominal, lot.medium)
    if found is None:
        return (
            "No pictograms: for this solution the laboratory's responsible person has confirmed "
            "none. A steward writes a confirmation down in the settings."
        )
    shown = ", ".join([*found.pictograms, found.signal_word]).rstrip(", ")
    day = typed_day_words(found.confirmed_on)
    return f"Hazards as {found.confirmed_by} confirmed them on {day}: {shown or 'statements'}."
