"""From a list of a Digital Calibration Certificate to a table of errors of indication.

Balances and thermometers: what indicates, beside a reference (VIM 2.16).
"""

from collections.abc import Sequence
from dataclasses import dataclass
from decimal import Decimal
from itertools import pairwise
from typing import Any

from server.intake.dcc import Table
from server.intake.dcc_quantity import Amount, Column, plain
from server.intake.dcc_units import unit_of
from server.lab.refusal import Unacceptable

NOMINAL, REFERENCE = "basic_nominalValue", "basic_referenceValue"
MEASURED, ERROR = "basic_measuredValue", "basic_measurementError"


@dataclass(frozen=True, slots=True)
class Scale:
    """What indicates: its unit, how that is written and called, which statement bounds the table.

    ``from_zero``: without a load it indicates zero, and no more needs to be stated there.
    """

    unit: str
    shown: str
    called: str
    bound: str
    from_zero: bool


MASS = Scale("g", "g", "a unit of mass", "error_u", from_zero=True)
TEMPERATURE = Scale("Cel", "°C", "degrees Celsius", "reading", from_zero=False)


@dataclass(frozen=True, slots=True)
class ErrorProposal:
    """A table of errors as a certificate gives it, for a person to confirm.

    ``rows`` are (indication, error of indication, what is added to it, standard uncertainty or
    None) in the scale's unit as text. ``fragment`` is ``error_table`` and the uncertainty of its
    corrections; a balance's bound of one reading (``linearity``) stands in no such list and is
    stated by the person.
    """

    rows: tuple[tuple[str, str, str, str | None], ...]
    says: tuple[str, ...]
    fragment: dict[str, Any]


def find_column(table: Table, ref_type: str) -> Column | None:
    """Return the column with a refType, also where a word is put behind it, or None."""
    exact = [one for one in table.columns if ref_type in one.ref_types and one.amounts]
    longer = [
        one
        for one in table.columns
        if one.amounts and any(word.startswith(f"{ref_type}_") for word in one.ref_types)
    ]
    found = exact or longer
    return found[0] if found else None


def error_tables(tables: tuple[Table, ...], scale: Scale = MASS) -> tuple[int, ...]:
    """Return which lists could be errors of indication of a scale, by their place."""
    return tuple(i for i, one in enumerate(tables) if _fits(one, scale))


def _fits(table: Table, scale: Scale) -> bool:
    measured, error = find_column(table, MEASURED), find_column(table, ERROR)
    load = find_column(table, REFERENCE) or find_column(table, NOMINAL)
    columns = [one for one in (measured, error, load) if one is not None]
    told = len(columns) >= 2 and (error is not None or measured is not None)
    return told and all(numbers_in(one, scale.unit) is not None for one in columns)


def error_proposal(table: Table, scale: Scale = MASS) -> ErrorProposal:
    """Return the table of errors that a list of a certificate makes.

    An error is indication less reference (VIM 2.16); what is added to an indication is its
    opposite. Where the certificate states indication, reference and error, they must agree.

    Raises:
        Unacceptable: the list lacks indication or error, its columns differ in length, its values
            are not in the scale's unit, or its numbers contradict each other.
    """
    measured, error = find_column(table, MEASURED), find_column(table, ERROR)
    load = find_column(table, REFERENCE) or find_column(table, NOMINAL)
    if error is None and (measured is None or load is None):
        says = "The list states neither errors nor both indications and reference values."
        raise Unacceptable(says, field="table")
    if measured is None and load is None:
        raise Unacceptable("The list states errors without the loads.", field="table")
    columns = [one for one in (measured, load, error) if one is not None]
    check_lengths(columns)
    indications, errors = _numbers(measured, load, error, scale=scale)
    uncertain = error if error is not None and has_u(error) else measured
    us = [None] * len(errors) if uncertain is None else us_in(uncertain, scale.unit)
    check_rising(indications)
    rows = tuple(
        (plain(at), plain(one), plain(-one), None if u is None else plain(u))
        for at, one, u in zip(indications, errors, us, strict=True)
    )
    return ErrorProposal(rows, _sentences(rows, measured, scale), _fragment(rows, scale))


def _numbers(
    measured: Column | None, load: Column | None, error: Column | None, *, scale: Scale
) -> tuple[list[Decimal], list[Decimal]]:
    """Return indications and errors in the scale's unit, whichever columns there are."""
    shown = None if measured is None else need_numbers(measured, scale)
    true = None if load is None else need_numbers(load, scale)
    told = None if error is None else need_numbers(error, scale)
    if told is None:
        assert shown is not None  # noqa: S101 - the caller has made sure of it
        assert true is not None  # noqa: S101 - the caller has made sure of it
        return shown, [a - b for a, b in zip(shown, true, strict=True)]
    if shown is None:
        assert true is not None  # noqa: S101 - the caller has made sure of it
        return [a + b for a, b in zip(true, told, strict=True)], told
    if true is not None and load is not None and REFERENCE in " ".join(load.ref_types):
        _check_agreement(shown, true, told, scale.shown)
    return shown, told


def _check_agreement(
    shown: list[Decimal], true: list[Decimal], told: list[Decimal], unit: str
) -> None:
    for i, (a, b, e) in enumerate(zip(shown, true, told, strict=True), start=1):
        digits = max(int(one.as_tuple().exponent) for one in (a, b, e))
        if abs(a - b - e) > 2 * Decimal(1).scaleb(digits):
            says = (
                f"Row {i}: indication less reference is {plain(a - b)} {unit}, but the error is "
                f"stated as {plain(e)} {unit}. Look at the certificate before taking any of it."
            )
            raise Unacceptable(says, field="table")


def need_numbers(column: Column, scale: Scale) -> list[Decimal]:
    """Return a column's numbers in the scale's unit.

    Raises:
        Unacceptable: it states them in another one.
    """
    found = numbers_in(column, scale.unit)
    if found is None:
        units = sorted({one.unit for one in column.amounts})
        stated = ", ".join(units)[:60]
        says = f"The column “{column.name}” is in {stated}, not in {scale.called}."
        raise Unacceptable(says, field="table")
    return found


def numbers_in(column: Column, unit: str) -> list[Decimal] | None:
    """Return a column's numbers in a unit, None where none of its forms is in such a unit."""
    found = form_in(column, unit)
    return None if found is None else [scaled(one.value, one) for one in found]


def form_in(column: Column, unit: str) -> tuple[Amount, ...] | None:
    """Return the first of a column's forms that becomes the unit by a power of ten, or None."""
    for amounts in (column.amounts, *column.others):
        units = [unit_of(one.unit) for one in amounts]
        if all(one is not None and one[0] == unit for one in units):
            return amounts
    return None


def scaled(text: str, one: Amount) -> Decimal:
    """Return a number of an amount in the unit that is kept here, with its own digits."""
    unit = unit_of(one.unit)
    return Decimal(text).scaleb(unit[1] if unit else 0)


def has_u(column: Column) -> bool:
    """Say whether a column states an uncertainty anywhere."""
    return any(one.U is not None for one in column.amounts)


def us_in(column: Column, unit: str) -> list[Decimal | None]:
    """Return a column's standard uncertainties in a unit, None where none is stated.

    Raises:
        Unacceptable: an expanded uncertainty without its coverage factor.
    """
    return [_u(one) for one in form_in(column, unit) or column.amounts]


def _u(one: Amount) -> Decimal | None:
    if one.U is None:
        return None
    if one.k is None:
        says = f"U = {one.U} is stated without its coverage factor."
        raise Unacceptable(says, field="table")
    k = Decimal(one.k)
    if k <= 0:
        raise Unacceptable(f"The coverage factor {one.k} must be above zero.", field="table")
    return round(scaled(one.U, one) / k, 15).normalize()


def check_lengths(columns: Sequence[Column]) -> None:
    """Refuse columns of different lengths.

    Raises:
        Unacceptable: they differ.
    """
    if len({len(one.amounts) for one in columns}) != 1:
        says = "The list's columns have different lengths: " + ", ".join(
            f"“{one.name}” {len(one.amounts)}" for one in columns
        )
        raise Unacceptable(f"{says}.", field="table")


def check_rising(indications: Sequence[Decimal]) -> None:
    """Refuse indications that do not rise.

    Raises:
        Unacceptable: one is not above that before it.
    """
    for i, (a, b) in enumerate(pairwise(indications), start=2):
        if a >= b:
            says = f"Row {i}: the indications must rise from row to row."
            raise Unacceptable(says, field="table")


def _sentences(
    rows: tuple[tuple[str, str, str, str | None], ...], measured: Column | None, scale: Scale
) -> tuple[str, ...]:
    largest = max(rows, key=lambda row: abs(Decimal(row[1])))
    true = plain(Decimal(largest[0]) + Decimal(largest[2]))
    found = [f"A reading of {largest[0]} {scale.shown} is then taken as {true} {scale.shown}."]
    if measured is None:
        found.append("No indications are listed: they are the reference values with their errors.")
    if any(row[3] is None for row in rows):
        found.append("Not every error states an uncertainty: state it yourself.")
    return tuple(found)


def _fragment(rows: tuple[tuple[str, str, str, str | None], ...], scale: Scale) -> dict[str, Any]:
    table = [[row[0], row[2]] for row in rows]
    if scale.from_zero and Decimal(table[0][0]) > 0:
        table.insert(0, ["0", "0"])
    found: dict[str, Any] = {"error_table": table}
    stated = [Decimal(row[3]) for row in rows if row[3] is not None]
    if len(stated) == len(rows):
        found[scale.bound] = {"unit": scale.unit, "u": plain(max(stated))}
    return found
