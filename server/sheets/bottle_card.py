"""The card of one bottle, readable at arm's length."""

from datetime import datetime
from decimal import Decimal

from sqlalchemy.orm import Session

from server.chemistry.cautions import DEFERRAL
from server.chemistry.substances import name_of
from server.evaluation.at_temperature import HIGH_C, LOW_C
from server.lab.actor import Actor
from server.lab.roles import Act
from server.lab.states import STANDING
from server.metrology.rounding import rounded_pair
from server.records.queries.list_certificates import KeptCertificate, certificates_of_lot
from server.records.queries.list_shelf import BottleOnShelf
from server.records.queries.list_watches import BOTTLE, standing_watch
from server.records.queries.load_papers import load_laboratory_fact
from server.sheets.look_up import at_temperature, read_celsius
from server.sheets.parts.by_code import find_bottle
from server.sheets.parts.doors import may_hold, may_release, need_shelf
from server.sheets.parts.history import history_chart, history_lines, state_of_certificate
from server.sheets.parts.label_state import label_says
from server.sheets.parts.outcome import Printed, printed
from server.sheets.parts.roots import caution_views
from server.sheets.parts.shelf_state import (
    concentration_in_force,
    held_says,
    nominal_words,
    state_of_bottle,
    why_of_bottle,
)
from server.sheets.parts.telling import due_words, last_day_words, moment_words, signed_words
from server.sheets.shelf import AtTemperature, BottleCard
from server.sheets.uses_page import uses_of

_NO_NUMBER = Printed("", "", "", "", "", "", "", 0, "")
_AT_FIRST = "20.0"
_STEP = Decimal(1)


def open_bottle_card(
    session: Session, code: str, *, at: str | None, actor: Actor | None, now: datetime
) -> BottleCard:
    """Return the card of a bottle; ``at`` is the temperature of use in °C as typed.

    Raises:
        NotFound: no bottle has this code; ``shown["nearest"]`` holds codes close to it.
        Unacceptable: ``at`` is no temperature from 0 to 40 °C.
        NotSignedIn: a visitor where the laboratory has closed its shelf.
    """
    laboratory = load_laboratory_fact(session)
    need_shelf(laboratory.settings, actor)
    celsius = read_celsius(at or _AT_FIRST)
    one = find_bottle(session, code)
    lot, bottle, zone = one.lot, one.bottle, laboratory.zone
    state = state_of_bottle(one, now)
    result = concentration_in_force(lot, state)
    number = printed(result) if result else _NO_NUMBER
    certificate = lot.certificate if result else None
    good = one.good_until if result else None
    tends = actor is not None and actor.may(Act.BOTTLE) and bottle.used_up_at is None
    history = _history(session, one, actor=actor, in_force=result is not None)
    return BottleCard(
        code=bottle.code,
        number=bottle.number,
        lot_code=lot.lot.code,
        lot_name=lot.lot.name,
        titrant=name_of(lot.lot.titrant).capitalize(),
        nominal=nominal_words(lot.lot.nominal),
        place=bottle.place,
        state=state,
        in_force=result is not None,
        why=why_of_bottle(one, state, zone),
        value=number.value,
        uncertainty=number.uncertainty,
        unit=number.unit,
        k=number.k,
        beside=number.beside,
        coverage=number.coverage,
        factor=number.factor,
        valid_for=certificate.document["valid_for"] if certificate else "",
        good_until=last_day_words(good.at, zone) if good else "",
        good_until_rule=good.rule if good else "",
        due_in=due_words(good.at, now, zone) if good else "",
        certificate_number=certificate.row.number if certificate else "",
        certificate_url=f"/certificates/{certificate.row.number}" if certificate else "",
        checked=signed_words(now, zone),
        at=_at(session, one, celsius) if certificate else None,
        history=history_lines(history, zone),
        history_chart=history_chart(history, zone),
        cautions=caution_views((lot.lot.titrant,)),
        deferral=DEFERRAL,
        may_hold=may_hold(actor, one.hold) and not _gone(one),
        may_release=may_release(actor, one.hold),
        may_use_up=tends,
        may_open=tends and bottle.opened_at is None,
        may_move=tends,
        held_says=_held_says(one, zone) if actor is not None else "",
        label_says=label_says(session, one, laboratory.settings) if actor is not None else "",
        opened=_opened(one, zone),
        watching=(
            actor is not None
            and standing_watch(session, actor.person_id, BOTTLE, bottle.id) is not None
        ),
        uses=uses_of(session, bottle, reader=actor) if actor is not None else None,
    )


def _history(
    session: Session, one: BottleOnShelf, *, actor: Actor | None, in_force: bool
) -> list[KeptCertificate]:
    """Return the lot's certificates where the bottle may show a number at all.

    A visitor gets the standing one only: no number reaches the shelf that does not stand.
    """
    if not in_force:
        return []
    found = certificates_of_lot(session, one.bottle.lot_id)
    return [kept for kept in found if actor or state_of_certificate(kept) == STANDING]


def _at(session: Session, one: BottleOnShelf, celsius: Decimal) -> AtTemperature:
    found = at_temperature(session, one.lot, celsius)
    value, uncertainty = rounded_pair(found["value"], found["U"])
    cooler, warmer = max(Decimal(LOW_C), celsius - _STEP), min(Decimal(HIGH_C), celsius + _STEP)
    return AtTemperature(
        celsius=f"{celsius}",
        value=value,
        uncertainty=uncertainty,
        cooler=_steps(cooler),
        warmer=_steps(warmer),
        says=found["says"],
    )


def _opened(one: BottleOnShelf, zone: str) -> str:
    """Return when a bottle was opened, and until when it keeps open where its lot limits that."""
    if one.bottle.opened_at is None:
        return ""
    opened = moment_words(one.bottle.opened_at, zone)
    until = one.bottle.opened_until
    return f"{opened}; open it keeps until {last_day_words(until, zone)}" if until else opened


def _steps(celsius: Decimal) -> str:
    """Return a temperature of the stepper with one decimal at least."""
    text = str(celsius)
    return text if "." in text else f"{text}.0"


def _gone(one: BottleOnShelf) -> bool:
    """Say whether a bottle is out of use for good."""
    return one.bottle.used_up_at is not None or one.lot.pulled


def _held_says(one: BottleOnShelf, zone: str) -> str:
    says = (held_says(one.hold, "bottle", zone), held_says(one.lot.hold, "lot", zone))
    return " ".join(words for words in says if words)
