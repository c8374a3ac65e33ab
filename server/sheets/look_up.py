"""The look-up of a bottle for programs: what interfaces promise, key by key."""

from datetime import datetime
from decimal import Decimal
from typing import Any

from sqlalchemy.orm import Session

from server.evaluation.at_temperature import HIGH_C, LOW_C, concentration_at
from server.lab.actor import Actor
from server.lab.refusal import Unacceptable
from server.metrology.decimal_text import DecimalProblem, read_typed_decimal
from server.metrology.quantity import Quantity, read_quantity
from server.records.queries.list_shelf import BottleOnShelf, LotOnShelf
from server.records.queries.load_papers import load_laboratory_fact, load_recipe_fact
from server.sheets.parts.by_code import find_bottle
from server.sheets.parts.doors import need_shelf
from server.sheets.parts.shelf_state import concentration_in_force, state_of_bottle


def look_up(
    session: Session, code: str, *, at: str | None, now: datetime, actor: Actor | None = None
) -> dict[str, Any]:
    """Return what a program gets of a bottle: a number only where a standing certificate is good.

    ``at`` is a temperature in °C as text: it adds ``at_temperature``, c of the liquid there.

    Raises:
        NotFound: no bottle has this code; ``shown["nearest"]`` holds codes close to it.
        Unacceptable: ``at`` is no temperature from 0 to 40 °C.
        NotSignedIn: a visitor where the laboratory has closed its shelf.
    """
    need_shelf(load_laboratory_fact(session).settings, actor)
    celsius = None if at is None else read_celsius(at)
    one = find_bottle(session, code)
    found = tell(one, now=now)
    if celsius is not None:
        certified = found["in_force"]
        found["at_temperature"] = at_temperature(session, one.lot, celsius) if certified else None
    return found


def tell(one: BottleOnShelf, *, now: datetime) -> dict[str, Any]:
    """Return what is to be told of a bottle that was looked up, at an instant."""
    state = state_of_bottle(one, now)
    result = concentration_in_force(one.lot, state)
    return {
        "bottle": one.bottle.code,
        "titrant": one.lot.lot.titrant,
        "lot": one.lot.lot.name,
        "state": state,
        "in_force": result is not None,
        "concentration": result["concentration"] if result else None,
        "factor": result["factor"] if result else None,
        **_certified(one, good=result is not None),
        "as_of": now.isoformat(),
    }


def read_celsius(text: str) -> Decimal:
    """Return a temperature as typed.

    Raises:
        Unacceptable: it is no number, or outside 0 to 40 °C.
    """
    try:
        celsius = read_typed_decimal(text, "at")
    except DecimalProblem as problem:
        raise Unacceptable(problem.says, field="at", example="24.0") from problem
    if not LOW_C <= celsius <= HIGH_C:
        says = f"at must be a temperature from {LOW_C:g} to {HIGH_C:g} °C; {text[:40]} is not."
        raise Unacceptable(says, field="at", example="24.0")
    return celsius


def at_temperature(session: Session, lot: LotOnShelf, celsius: Decimal) -> dict[str, Any]:
    """Return the certified concentration in the liquid at a temperature in °C."""
    if lot.certificate is None:
        raise ValueError("a lot without a certificate has no concentration")
    document = lot.certificate.document
    recipe = load_recipe_fact(session, document["recipe"]["id"])
    stated = recipe.document.liquid_expansion
    expansion: Quantity | None = None
    if stated is not None:
        expansion = read_quantity(stated, "liquid_expansion", unit="1/K")
    return concentration_at(
        document["result"]["concentration"], float(celsius), expansion=expansion
    )


def _certified(one: BottleOnShelf, *, good: bool) -> dict[str, Any]:
    """Return what the certificate adds to the number; nothing of it where there is no number."""
    until, lot = one.good_until, one.lot
    if lot.certificate is None or until is None or not good:
        return {"valid_for": None, "valid_until": None, "certificate": None}
    row, document = lot.certificate.row, lot.certificate.document
    return {
        "valid_for": {
            "words": document["valid_for"],
            "end_point": document["end_point"]["mode"],
            "indicator": document["end_point"]["indicator"],
            "medium": document["lot"]["medium"],
        },
        "valid_until": until.at.isoformat(),
        "certificate": {"number": row.number, "url": f"/certificates/{row.number}"},
    }
