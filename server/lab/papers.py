"""What the papers of standard lots and instruments must state, read strictly."""

from collections.abc import Mapping, Sequence
from decimal import Decimal
from itertools import pairwise
from typing import Any

from server.lab import reading_documents as reading
from server.lab.refusal import Unacceptable
from server.lab.sheet_facts import (
    BALANCE,
    BURETTE,
    FLASK,
    INSTRUMENT_KINDS,
    PIPETTE,
    PROBE,
    ROOM,
    THERMOMETER,
)
from server.metrology.decimal_text import DecimalProblem, read_wire_decimal

_KEYS = {
    BALANCE: ("linearity", "error_table", "error_u", "minimum_g"),
    BURETTE: ("capacity", "delivery", "error_table", "glass_expansion"),
    PIPETTE: ("delivery", "glass_expansion"),
    FLASK: ("volume", "glass_expansion"),
    PROBE: ("slope_percent", "u_slope_percent", "offset_mV", "u_offset_mV"),
    THERMOMETER: ("reading", "error_table"),
    ROOM: ("temperature", "pressure", "humidity"),
}
_ROOM_UNITS = {"temperature": "Cel", "pressure": "hPa", "humidity": "%"}
_VOLUMES = {PIPETTE: "delivery", FLASK: "volume"}


def check_kind(kind: str) -> str:
    """Return the kind of an instrument, or refuse one that is not known."""
    if kind not in INSTRUMENT_KINDS:
        says = f"kind cannot be “{kind}”; it is one of {', '.join(INSTRUMENT_KINDS)}."
        raise Unacceptable(says, field="kind", example=BALANCE)
    return kind


def read_calibration(kind: str, document: Any) -> dict[str, Any]:
    """Return a calibration's statements: the fragment of a bench record.

    An ``error_table`` holds readings and what is *added* to them. A probe states slope and offset,
    a pipette or flask its volume at 20 °C.

    Raises:
        Unacceptable: an unknown key, a missing statement, a wrong unit, a table out of order.
    """
    doc = reading.known_keys(document, "document", _KEYS[kind])
    if kind == BALANCE:
        read: dict[str, Any] = {
            "linearity": _bound(doc, "linearity", "g", required=True),
            "error_table": _table(doc, "load in g"),
            "error_u": _bound(doc, "error_u", "g"),
            "minimum_g": _above_zero(doc, "minimum_g", example="0.020"),
        }
    elif kind == BURETTE:
        read = {
            "capacity": reading.positive_at(doc, "capacity", "document", unit="mL"),
            "delivery": _bound(doc, "delivery", "mL"),
            "error_table": _table(doc, "reading in mL"),
            "glass_expansion": _decimal(doc, "glass_expansion"),
        }
        _need(read, "capacity", '{"value": "20", "unit": "mL"}')
        if read["delivery"] is None and read["error_table"] is None:
            says = "Give the bound of a delivery, the table of corrections, or both."
            raise Unacceptable(says, field="document.delivery", example=_DELIVERY)
    elif kind in _VOLUMES:
        read = {
            _VOLUMES[kind]: _volume(doc, _VOLUMES[kind]),
            "glass_expansion": _decimal(doc, "glass_expansion"),
        }
    elif kind == PROBE:
        read = _probe(doc)
    elif kind == THERMOMETER:
        read = {
            "reading": _bound(doc, "reading", "Cel", required=True),
            "error_table": _table(doc, "reading in °C"),
        }
    else:
        read = {key: _bound(doc, key, unit, required=True) for key, unit in _ROOM_UNITS.items()}
    return {key: value for key, value in read.items() if value is not None}


def _volume(doc: Mapping[str, Any], key: str) -> dict[str, Any]:
    """Return a volume at 20 °C that states its uncertainty."""
    found = reading.positive_at(doc, key, "document", unit="mL")
    if found is None or not {"u", "U", "half_width"} & found.keys():
        says = f"document.{key} states the volume at 20 °C and its uncertainty."
        example = '{"value": "10.003", "unit": "mL", "u": "0.002"}'
        raise Unacceptable(says, field=f"document.{key}", example=example)
    return found


def _probe(doc: Mapping[str, Any]) -> dict[str, Any]:
    read: dict[str, Any] = {
        "slope_percent": _above_zero(doc, "slope_percent", example="98.6"),
        "u_slope_percent": _above_zero(doc, "u_slope_percent", example="0.3"),
        "u_offset_mV": _above_zero(doc, "u_offset_mV", example="0.5"),
    }
    _need(read, "slope_percent", "98.6")
    _need({"offset_mV": doc.get("offset_mV") or None}, "offset_mV", "-4.2")
    _number(doc["offset_mV"], "document.offset_mV", example="-4.2")
    return read | {"offset_mV": doc["offset_mV"]}


def _above_zero(doc: Mapping[str, Any], key: str, *, example: str) -> str | None:
    """Return a number above zero as typed, or None where it is absent or empty."""
    if doc.get(key) is None or doc[key] == "":
        return None
    field = f"document.{key}"
    if _number(doc[key], field, example=example) <= 0:
        raise Unacceptable(f"{field} must be above zero.", field=field, example=example)
    return str(doc[key])


_DELIVERY = '{"unit": "mL", "half_width": "0.03", "shape": "triangular"}'


def _need(read: Mapping[str, Any], key: str, example: str) -> None:
    if read.get(key) is None:
        says = f"document.{key} is missing."
        raise Unacceptable(says, field=f"document.{key}", example=example)


def _bound(
    doc: Mapping[str, Any], key: str, unit: str, *, required: bool = False
) -> dict[str, Any] | None:
    """Return a bound: a quantity that states an uncertainty and no value."""
    bound = reading.quantity_at(doc, key, "document", unit=unit, needs_value=False)
    example = f'{{"unit": "{unit}", "half_width": "0.1", "shape": "rectangular"}}'
    if required:
        _need({key: bound}, key, example)
    if bound is None:
        return None
    if not {"u", "U", "half_width"} & bound.keys() or "value" in bound:
        says = f"document.{key} is a bound: it states an uncertainty and no value."
        raise Unacceptable(says, field=f"document.{key}", example=example)
    return bound


def _decimal(doc: Mapping[str, Any], key: str) -> str | None:
    if doc.get(key) is None or doc[key] == "":
        return None
    field, example = f"document.{key}", "9.9e-6"
    if not 0 <= _number(doc[key], field, example=example) < Decimal("1e-3"):
        says = f"{field}: a cubic expansion of glass lies between 0 and 0.001 per K."
        raise Unacceptable(says, field=field, example=example)
    return str(doc[key])


def _table(doc: Mapping[str, Any], head: str) -> list[list[str]] | None:
    table = doc.get("error_table")
    if table is None or table in ("", []):
        return None
    field, example = "document.error_table", '[["0", "0.0000"], ["100", "0.0001"]]'
    if not (_is_list(table) and len(table) > 1 and all(_is_list(r) and len(r) == 2 for r in table)):
        says = f"{field} needs at least two rows of two numbers: {head}, what is added to it."
        raise Unacceptable(says, field=field, example=example)
    readings = [_number(row[0], f"{field}[{i}]", example="10.0") for i, row in enumerate(table)]
    for i, row in enumerate(table):
        _number(row[1], f"{field}[{i}]", example="-0.003")
    if any(a >= b for a, b in pairwise(readings)):
        says = f"{field}: the {head} must rise from row to row."
        raise Unacceptable(says, field=field, example=example)
    return [[str(row[0]), str(row[1])] for row in table]


def _is_list(value: Any) -> bool:
    return isinstance(value, Sequence) and not isinstance(value, str)


def _number(value: Any, path: str, *, example: str) -> Decimal:
    if not isinstance(value, str):
        raise Unacceptable(f"{path} must be a number as text.", field=path, example=example)
    try:
        return read_wire_decimal(value, path)
    except DecimalProblem as problem:
        raise Unacceptable(problem.says, field=path, example=example) from problem
