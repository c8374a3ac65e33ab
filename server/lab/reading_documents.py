"""Reading JSON-like documents strictly: each refusal names the path, what is wrong, an example."""

from collections.abc import Iterable, Mapping, Sequence
from decimal import Decimal
from typing import Any

from server.lab.free_text import check_text
from server.lab.refusal import Unacceptable
from server.metrology.quantity import QuantityProblem, read_quantity


def known_keys(document: Any, path: str, keys: Iterable[str]) -> Mapping[str, Any]:
    """Return the object, or refuse it when it is none or holds a key nobody knows."""
    if not isinstance(document, Mapping):
        raise Unacceptable(f"{path or 'The document'} must be an object.", field=path or None)
    allowed = sorted(keys)
    for key in document:
        if key not in allowed:
            where = f"{path}.{key}" if path else str(key)
            says = f"{where} is not known here; known are {', '.join(allowed)}."
            raise Unacceptable(says, field=where)
    return document


def text_at(
    document: Mapping[str, Any],
    key: str,
    path: str,
    *,
    example: str,
    default: str | None = None,
    most: int = 500,
) -> str:
    """Return a non-empty text, or the default where the key is absent."""
    where = f"{path}.{key}" if path else key
    value = document.get(key, default)
    if not isinstance(value, str) or (not value.strip() and value != default):
        raise Unacceptable(f"{where} must be a text.", field=where, example=example)
    check_text(value, where, most=most)
    return value.strip()


def choice_at(
    document: Mapping[str, Any],
    key: str,
    path: str,
    *,
    choices: Sequence[str],
    default: str | None = None,
) -> str:
    """Return one of the choices."""
    value = text_at(document, key, path, example=choices[0], default=default)
    if value not in choices:
        where = f"{path}.{key}" if path else key
        says = f"{where} cannot be “{value}”; it is one of {', '.join(choices)}."
        raise Unacceptable(says, field=where, example=choices[0])
    return value


def count_at(
    document: Mapping[str, Any], key: str, path: str, *, low: int, high: int, default: int
) -> int:
    """Return a whole number between two bounds; digits in a text are taken too."""
    where = f"{path}.{key}" if path else key
    value = document.get(key, default)
    if isinstance(value, str) and value.isascii() and value.isdigit() and len(value) < 10:
        value = int(value)
    if not isinstance(value, int) or isinstance(value, bool) or not low <= value <= high:
        says = f"{where} must be a whole number from {low} to {high}."
        raise Unacceptable(says, field=where, example=str(default))
    return value


def truth_at(document: Mapping[str, Any], key: str, path: str, *, default: bool) -> bool:
    """Return true or false."""
    value = document.get(key, default)
    if not isinstance(value, bool):
        where = f"{path}.{key}" if path else key
        raise Unacceptable(f"{where} must be true or false.", field=where, example="true")
    return value


def quantity_at(
    document: Mapping[str, Any],
    key: str,
    path: str,
    *,
    unit: str | None,
    needs_value: bool = True,
) -> dict[str, Any] | None:
    """Return the quantity's own object after checking it, or None where the key is absent."""
    value = document.get(key)
    if value is None:
        return None
    where = f"{path}.{key}" if path else key
    try:
        read_quantity(value, where, unit=unit, needs_value=needs_value)
    except QuantityProblem as problem:
        raise Unacceptable(problem.says, field=problem.path, example=problem.example) from problem
    return dict(value)


def positive_at(
    document: Mapping[str, Any], key: str, path: str, *, unit: str | None
) -> dict[str, Any] | None:
    """Return the object of a quantity above zero, or None where the key is absent."""
    quantity = quantity_at(document, key, path, unit=unit)
    if quantity is not None and Decimal(quantity["value"]) <= 0:
        where = f"{path}.{key}.value" if path else f"{key}.value"
        raise Unacceptable(f"{where} must be above zero.", field=where)
    return quantity
