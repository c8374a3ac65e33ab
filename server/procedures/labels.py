"""Labels: printed for bottles, and printed again with a reason."""

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import datetime

from sqlalchemy.orm import Session

from server.lab.actor import Actor
from server.lab.codes import read_code
from server.lab.free_text import MOST_REASON, read_text
from server.lab.label_hazards import hazards_of
from server.lab.label_print import LabelStock, LabelText, LabelValue
from server.lab.own_site import read_base_url
from server.lab.refusal import NotAllowed, NotFound, Unacceptable
from server.lab.roles import Act
from server.lab.sheet_facts import LaboratoryFact
from server.lab.states import may_be_used
from server.procedures.acts import Thing, note_act
from server.records.queries.list_labels import LABEL_PRINTED, labels_of_bottles
from server.records.queries.list_shelf import BottleOnShelf, bottle_on_shelf
from server.records.queries.load_lots import bottle_by_code
from server.records.queries.load_papers import load_laboratory_fact
from server.records.tables.lots import Bottle
from server.records.trail import head

MOST_LABELS = 100


@dataclass(frozen=True, slots=True)
class PrintLabels:
    """Labels for bottles, by their codes.

    ``reason`` is asked where one of them had a label before. ``base_url`` is the address that
    their QR codes lead to while the laboratory has set none of its own.
    """

    bottles: tuple[str, ...]
    stock: str
    first_place: int = 1
    dots_per_inch: int = 300
    reason: str = ""
    base_url: str = ""


@dataclass(frozen=True, slots=True)
class ReadyLabels:
    """What a print will say, label by label, and onto what."""

    texts: tuple[LabelText, ...]
    onto: LabelStock
    bottle_ids: tuple[str, ...]


def prepare_labels(
    session: Session, command: PrintLabels, *, actor: Actor, now: datetime
) -> ReadyLabels:
    """Return what labels of bottles would say now; nothing is written.

    Raises:
        NotFound: a code that no bottle has.
        NotAllowed: a bottle that is used up, or out of use for good.
        Unacceptable: no bottle, too many, one twice; a label printed before and no reason.
    """
    actor.need(Act.LABEL)
    bottles = _bottles(session, command.bottles)
    laboratory = load_laboratory_fact(session)
    before = {one.bottle_id for one in labels_of_bottles(session, [one.id for one in bottles])}
    reason = read_text(command.reason, "reason", most=MOST_REASON)
    if before and not reason:
        codes = ", ".join(one.code for one in bottles if one.id in before)
        says = f"{codes} had a label before: give the reason why it is printed again."
        raise Unacceptable(says, field="reason", example="label lost in the wash")
    base_url = laboratory.settings.get("base_url") or read_base_url(command.base_url)
    if not base_url:
        says = "The laboratory's own address is not set: a steward sets it, for labels lead to it."
        raise Unacceptable(says, field="base_url", example="https://ledger.example")
    return ReadyLabels(
        texts=tuple(
            _text(session, one, laboratory, reason if one.id in before else "", now)
            for one in bottles
        ),
        onto=LabelStock(command.stock, base_url, command.first_place, command.dots_per_inch),
        bottle_ids=tuple(one.id for one in bottles),
    )


def print_labels(session: Session, command: PrintLabels, *, actor: Actor, now: datetime) -> int:
    """Write down that labels are printed, each with all that it says; return the print's number.

    Raises:
        NotFound, NotAllowed, Unacceptable: as ``prepare_labels``.
    """
    ready = prepare_labels(session, command, actor=actor, now=now)
    onto = {
        "stock": ready.onto.stock,
        "base_url": ready.onto.base_url,
        "first_place": ready.onto.first_place,
        "dots_per_inch": ready.onto.dots_per_inch,
    }
    for place, (text, bottle_id) in enumerate(
        zip(ready.texts, ready.bottle_ids, strict=True), start=1
    ):
        body = {"place": place, "of": len(ready.texts), "onto": onto, "label": text.kept()}
        thing = Thing("bottle", bottle_id, text.code)
        note_act(session, LABEL_PRINTED, thing, actor=actor, now=now, why=text.reason, body=body)
    # rows of one transaction follow one another: the head stays locked until its commit
    last, _ = head(session)
    return last - len(ready.texts) + 1


def _bottles(session: Session, codes: Sequence[str]) -> list[Bottle]:
    if not 1 <= len(codes) <= MOST_LABELS:
        says = f"Choose from 1 to {MOST_LABELS} bottles."
        raise Unacceptable(says, field="bottles", example="a code of 8 characters")
    found = []
    for text in codes:
        code = read_code(text)
        bottle = bottle_by_code(session, code)
        if bottle is None:
            raise NotFound(f"There is no bottle {code}.", field="bottles")
        if bottle in found:
            raise Unacceptable(f"Bottle {code} is there twice.", field="bottles")
        found.append(bottle)
    return found


def _text(
    session: Session, bottle: Bottle, laboratory: LaboratoryFact, reason: str, now: datetime
) -> LabelText:
    one = bottle_on_shelf(session, bottle)
    lot = one.lot.lot
    if bottle.used_up_at is not None or one.lot.pulled:
        what = "its lot was pulled" if one.lot.pulled else "it is used up"
        raise NotAllowed(f"Bottle {bottle.code} gets no label: {what}.", field="bottles")
    return LabelText(
        code=bottle.code,
        titrant=lot.titrant,
        nominal=lot.nominal,
        lot=lot.name,
        bottle=bottle.number,
        prepared_on=str(lot.document.get("prepared_on") or ""),
        laboratory=laboratory.name,
        address=laboratory.address,
        zone=laboratory.zone,
        value=_value(one, now) if laboratory.settings.get("label_value") else None,
        hazards=hazards_of(laboratory.settings, lot.titrant, lot.nominal, lot.medium),
        reason=reason,
    )


def _value(one: BottleOnShelf, now: datetime) -> LabelValue | None:
    """Return the certified value of a bottle in force; of no other one."""
    standing = one.lot.certificate
    if standing is None or not may_be_used(one.state(now)):
        return None
    return LabelValue(
        reported=standing.document["result"]["concentration"]["reported"],
        certificate=standing.row.number,
        valid_until=standing.document["validity"]["last_day"],
    )
