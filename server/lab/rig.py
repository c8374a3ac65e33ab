"""What the instruments at the bench let a person write: decimals and ends of scales."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from decimal import Decimal, InvalidOperation
from typing import Any

from server.lab.sheet_facts import BALANCE, BURETTE, THERMOMETER, InstrumentFact

#: A burette with drawn graduations is read to a hundredth of a millilitre (common practice).
_BURETTE_DECIMALS = 2


@dataclass(frozen=True, slots=True)
class Span:
    """The two ends of what can be read, as text with its own digits."""

    low: str
    high: str


@dataclass(frozen=True, slots=True)
class Rig:
    """Decimals of each instrument's readings, their spans, and where the error tables end."""

    balance_decimals: int | None
    balance: Span | None
    balance_table: Span | None
    burette_decimals: int | None
    burette: Span | None
    burette_table: Span | None
    thermometer_decimals: int | None
    thermometer_table: Span | None = None


def rig_of(instruments: Sequence[InstrumentFact]) -> Rig:
    """Return what a sheet's instruments let be written."""
    by_kind = {one.kind: one for one in instruments}
    balance, burette = by_kind.get(BALANCE), by_kind.get(BURETTE)
    thermometer = by_kind.get(THERMOMETER)
    return Rig(
        balance_decimals=read_decimals(BALANCE, balance.identity) if balance else None,
        balance=_scale(balance.identity.get("capacity")) if balance else None,
        balance_table=_table_span(balance.document) if balance else None,
        burette_decimals=read_decimals(BURETTE, burette.identity) if burette else None,
        burette=_scale(_capacity(burette)) if burette else None,
        burette_table=_table_span(burette.document) if burette else None,
        thermometer_decimals=(
            read_decimals(THERMOMETER, thermometer.identity) if thermometer else None
        ),
        thermometer_table=_table_span(thermometer.document) if thermometer else None,
    )


def read_decimals(kind: str, identity: Mapping[str, Any]) -> int | None:
    """Return how many decimals a reading of an instrument has, or None where nothing is stated."""
    stated = str(identity.get("decimals") or "")
    if stated.isascii() and stated.isdigit():
        return int(stated)
    resolution = str(identity.get("resolution") or "")
    if not resolution:
        return None
    try:
        own = max(0, -int(Decimal(resolution).as_tuple().exponent))
    except (InvalidOperation, ValueError):
        return None
    return max(own, _BURETTE_DECIMALS) if kind == BURETTE else own


def _capacity(burette: InstrumentFact) -> str | None:
    stated = burette.document.get("capacity")
    value = stated.get("value") if isinstance(stated, Mapping) else None
    return value or burette.identity.get("capacity")


def _scale(capacity: Any) -> Span | None:
    return Span("0", str(capacity)) if capacity else None


def _table_span(document: Mapping[str, Any]) -> Span | None:
    table = document.get("error_table")
    if not table:
        return None
    try:
        readings = sorted((str(row[0]) for row in table), key=Decimal)
    except InvalidOperation:
        return None
    return Span(readings[0], readings[-1])
