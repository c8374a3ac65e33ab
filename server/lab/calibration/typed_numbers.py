"""Numbers of a calibration's document, read from the text that was typed."""

from collections.abc import Mapping, Sequence
from decimal import Decimal
from typing import Any

from server.lab.refusal import Unacceptable
from server.metrology.decimal_text import DecimalProblem, read_wire_decimal
from server.metrology.glassware import interpolate_error
from server.metrology.propagation import Input
from server.metrology.quantity import Quantity, QuantityProblem, read_quantity

#: Volumes and masses are written out with so many decimals that no digit that counts is lost.
_DECIMALS = 9


def number_at(
    document: Mapping[str, Any],
    key: str,
    path: str,
    *,
    example: str,
    low: str | None = None,
    high: str | None = None,
) -> Decimal:
    """Return a number that must be there, between two bounds where they are given."""
    where = f"{path}.{key}" if path else key
    if document.get(key) in (None, ""):
        raise Unacceptable(f"{where} is missing.", field=where, example=example)
    return read_number(document[key], where, example=example, low=low, high=high)


def optional_number(
    document: Mapping[str, Any],
    key: str,
    path: str,
    *,
    example: str,
    low: str | None = None,
    high: str | None = None,
) -> Decimal | None:
    """Return a number between two bounds, or None where the key is absent or empty."""
    if document.get(key) in (None, ""):
        return None
    return number_at(document, key, path, example=example, low=low, high=high)


def read_number(
    value: Any, where: str, *, example: str, low: str | None = None, high: str | None = None
) -> Decimal:
    """Return a number given as text.

    Raises:
        Unacceptable: it is no number as text, or lies outside the bounds.
    """
    if not isinstance(value, str):
        raise Unacceptable(f"{where} must be a number as text.", field=where, example=example)
    try:
        number = read_wire_decimal(value.strip(), where)
    except DecimalProblem as problem:
        raise Unacceptable(problem.says, field=where, example=example) from problem
    if (low is not None and number < Decimal(low)) or (high is not None and number > Decimal(high)):
        says = f"{where}: {value.strip()} must lie between {low or 'below'} and {high or 'above'}."
        if low is None or high is None:
            bound = f"at least {low}" if high is None else f"at most {high}"
            says = f"{where}: {value.strip()} must be {bound}."
        raise Unacceptable(says, field=where, example=example)
    return number


def list_at(
    document: Mapping[str, Any], key: str, path: str, *, least: int, most: int, what: str
) -> Sequence[Any]:
    """Return a list with so many members, or refuse it."""
    where = f"{path}.{key}" if path else key
    value = document.get(key)
    if not isinstance(value, list | tuple) or not least <= len(value) <= most:
        count = len(value) if isinstance(value, list | tuple) else "none"
        says = f"{where} takes {least} to {most} {what}; there are {count}."
        raise Unacceptable(says, field=where)
    return value


def bound_at(
    document: Mapping[str, Any], key: str, path: str, *, unit: str | None
) -> Quantity | None:
    """Return a bound: a statement of uncertainty without a value, or None where it is absent."""
    if document.get(key) in (None, ""):
        return None
    where = f"{path}.{key}" if path else key
    try:
        found = read_quantity(document[key], where, unit=unit, needs_value=False)
    except QuantityProblem as problem:
        raise Unacceptable(problem.says, field=problem.path, example=problem.example) from problem
    if found.statement is None or found.value is not None:
        says = f"{where} is a bound: it states an uncertainty and no value."
        example = f'{{"unit": "{unit or 1}", "half_width": "0.1", "shape": "rectangular"}}'
        raise Unacceptable(says, field=where, example=example)
    return found


def error_input(name: str, bound: Quantity | None, *, times: float = 1.0) -> Input | None:
    """Return a bound as an error around zero, ``times`` its u; None where there is none."""
    if bound is None or bound.statement is None or bound.u == 0:
        return None
    return Input(name=name, value=0.0, u=times * bound.u, dof=bound.statement.dof, unit=bound.unit)


def read_table(document: Mapping[str, Any], key: str) -> tuple[tuple[float, float], ...]:
    """Return an instrument's table of readings and what is added to them, empty where it is absent.

    The table comes from a calibration that was read before.
    """
    return tuple((float(row[0]), float(row[1])) for row in document.get(key) or ())


def corrected(table: Sequence[tuple[float, float]], reading: Decimal, where: str) -> float:
    """Return a reading with what the table adds to it.

    Raises:
        Unacceptable: the reading lies outside the table.
    """
    value = float(reading)
    if not table:
        return value
    try:
        return value + interpolate_error(table, value)
    except ValueError as problem:
        says = f"{where}: {problem}; the calibration in use reaches no further."
        raise Unacceptable(says, field=where) from problem


def as_text(value: float) -> str:
    """Return a computed number as plain text, with more decimals than any reading has."""
    text = f"{value:.{_DECIMALS}f}".rstrip("0")
    return "0" if text in {"0.", "-0."} else text.removesuffix(".")


def statement_of(unit: str, u: float, dof: float | None, source: str) -> dict[str, str]:
    """Return a bound as a calibration states it: u, its degrees of freedom, where it is from."""
    stated = {"unit": unit, "u": as_text(u), "source": source}
    return stated if dof is None else {**stated, "dof": f"{dof:.1f}"}
