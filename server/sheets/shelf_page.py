"""The shelf: bottles by code or words, due soonest first."""

import re
from collections.abc import Sequence
from datetime import datetime
from decimal import Decimal

from sqlalchemy.orm import Session

from server.chemistry.substances import name_of
from server.lab.actor import Actor
from server.lab.codes import code_in
from server.lab.states import BOTTLE_STATES, CHECK_DUE, IN_FORCE, may_be_used
from server.records.queries.list_shelf import BottleOnShelf, bottles_on_shelf
from server.records.queries.load_papers import load_laboratory_fact
from server.sheets.parts.by_code import as_code, near_bottles
from server.sheets.parts.doors import need_shelf
from server.sheets.parts.shelf_state import bottle_line, state_of_bottle
from server.sheets.parts.telling import count_words
from server.sheets.shelf import Shelf

_MOST_WORDS = 200
_SHORT = 2
_NUMBER = re.compile(r"[0-9]{1,12}([.,][0-9]{1,12})?").fullmatch


def open_shelf(
    session: Session,
    *,
    words: str,
    state: str,
    actor: Actor | None,
    now: datetime,
    titrant: str = "",
    place: str = "",
) -> Shelf:
    """Return the bottles that answer to words, state, titrant and place, due soonest first.

    A visitor sees those in force.

    Raises:
        NotSignedIn: a visitor where the laboratory has closed its shelf.
    """
    laboratory = load_laboratory_fact(session)
    need_shelf(laboratory.settings, actor)
    words = code_in(words) or words.strip()[:_MOST_WORDS]
    everything = bottles_on_shelf(session)
    states = {one.bottle.code: state_of_bottle(one, now) for one in everything}
    open_to = [
        one for one in everything if actor is not None or may_be_used(states[one.bottle.code])
    ]
    answering = [
        one
        for one in open_to
        if _answers(one, words)
        and state in {"", states[one.bottle.code]}
        and titrant in {"", one.lot.lot.titrant}
        and place in {"", one.bottle.place}
    ]
    answering.sort(key=lambda one: _soonest(one, states[one.bottle.code]))
    unknown = not answering and as_code(words) not in states
    return Shelf(
        words=words,
        bottles=tuple(bottle_line(one, now, laboratory.zone) for one in answering),
        says=_says(words, answering, states),
        nearest=tuple(near_bottles(session, as_code(words))) if unknown else (),
        states=(IN_FORCE, CHECK_DUE) if actor is None else tuple(BOTTLE_STATES),
        state=state if state in BOTTLE_STATES else "",
        titrants=tuple(sorted({one.lot.lot.titrant for one in open_to} | _asked(titrant))),
        titrant=titrant,
        places=tuple(sorted({one.bottle.place for one in open_to} | _asked(place))),
        place=place,
        only=as_code(words) if as_code(words) in states else "",
    )


def _asked(word: str) -> set[str]:
    """Return what was asked for as one to choose, also where no bottle has it."""
    return {word} if word else set()


def _answers(one: BottleOnShelf, words: str) -> bool:
    """Say whether every word stands somewhere in what the bottle is called.

    A number answers to the same number only: 0.1 is in 0.1 mol/L, not in 0.15 mol/L.
    """
    lot, bottle = one.lot.lot, one.bottle
    if as_code(words) in {bottle.code, lot.code}:
        return True
    called = (
        bottle.code, lot.code, lot.titrant, name_of(lot.titrant), lot.nominal, "mol/L", lot.name,
        lot.medium, bottle.place,
    )  # fmt: skip
    text = " ".join(called).casefold()
    numbers = {Decimal(found) for found in text.replace(",", " ").split() if _NUMBER(found)}
    for word in words.casefold().split():
        number = Decimal(word.replace(",", ".")) if _NUMBER(word) else None
        begins_code = len(word) > _SHORT and (
            bottle.code.startswith(word) or lot.code.startswith(word)
        )
        if not begins_code and (word not in text if number is None else number not in numbers):
            return False
    return True


def _soonest(one: BottleOnShelf, state: str) -> tuple[bool, float, str, int]:
    certificate = one.lot.certificate
    due = certificate.row.valid_until.timestamp() if certificate else float("inf")
    return not may_be_used(state), due, one.lot.lot.name, one.bottle.number


def _says(words: str, answering: Sequence[BottleOnShelf], states: dict[str, str]) -> str:
    code = as_code(words)
    if not answering and code in states:
        return f"Bottle {code} is {states[code]}."
    count = count_words(len(answering), "bottle")
    usable = sum(1 for one in answering if may_be_used(states[one.bottle.code]))
    return f"{count}, {usable} in force; due soonest first." if answering else "No bottle."
