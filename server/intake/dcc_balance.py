"""From a table of a Digital Calibration Certificate to a balance's table of errors."""

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
_UNIT = "g"


@dataclass(frozen=True, slots=True)
class BalanceProposal:
    """A balance's table of errors as a certificate gives it, for a person to confirm.

    ``rows`` are (indication, error of indication, what is added to it, standard uncertainty or
    None) in g as text. ``fragment`` is ``error_table`` and ``error_u`` of a calibration; the bound
    of one reading (``linearity``) stands in no such list and is stated by the person.
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


def balance_tables(tables: tuple[Table, ...]) -> tuple[int, ...]:
    """Return which tables could be a balance's errors, by their place."""
    return tuple(i for i, one in enumerate(tables) if _is_balance(one))


def _is_balance(table: Table) -> bool:
    measured, error = find_column(table, MEASURED), find_column(table, ERROR)
    load = find_column(table, REFERENCE) or find_column(table, NOMINAL)
    columns = [one for one in (measured, error, load) if one is not None]
    told = len(columns) >= 2 and (error is not None or measured is not None)
    return told and all(_in_grams(one) is not None for one in columns)


def balance_proposal(table: Table) -> BalanceProposal:
    """Return the table of errors that a list of a certificate makes.

    An error is indication less reference (VIM 2.16); what is added to an indication is its
    opposite. Where the certificate states indication, reference and error, they must agree.

    Raises:
        Unacceptable: the list lacks indication or error, its columns differ in length, its masses
            are not in a unit of mass, or its numbers contradict each other.
    """
    measured, error = find_column(table, MEASURED), find_column(table, ERROR)
    load = find_column(table, REFERENCE) or find_column(table, NOMINAL)
    if error is None and (measured is None or load is None):
        says = "The list states neither errors nor both indications and reference values."
        raise Unacceptable(says, field="table")
    if measured is None and load is None:
        raise Unacceptable("The list states errors without the loads.", field="table")
    columns = [one for one in (measured, load, error) if one is not None]
    counts = {len(one.amounts) for one in columns}
    if len(counts) != 1:
        says = "The list's columns have different lengths: " + ", ".join(
            f"“{one.name}” {len(one.amounts)}" for one in columns
        )
        raise Unacceptable(f"{says}.", field="table")
    indications, errors = _numbers(measured, load, error)
    uncertain = error if error is not None and _has_u(error) else measured
    stated = None if uncertain is None else _mass_form(uncertain)
    us = [None] * len(errors) if stated is None else [_u(one) for one in stated]
    _check_rising(indications)
    rows = tuple(
        (plain(at), plain(one), plain(-one), None if u is None else plain(u))
        for at, one, u in zip(indications, errors, us, strict=True)
    )
    return BalanceProposal(rows, _sentences(rows, measured), _fragment(rows))


def _numbers(
    measured: Column | None, load: Column | None, error: Column | None
) -> tuple[list[Decimal], list[Decimal]]:
    """Return indications and errors in g, whichever of the three columns there are."""
    shown = None if measured is None else _grams(measured)
    true = None if load is None else _grams(load)
    told = None if error is None else _grams(error)
    if told is None:
        assert shown is not None  # noqa: S101 - the caller has made sure of it
        assert true is not None  # noqa: S101 - the caller has made sure of it
        return shown, [a - b for a, b in zip(shown, true, strict=True)]
    if shown is None:
        assert true is not None  # noqa: S101 - the caller has made sure of it
        return [a + b for a, b in zip(true, told, strict=True)], told
    if true is not None and load is not None and REFERENCE in " ".join(load.ref_types):
        _check_agreement(shown, true, told)
    return shown, told


def _check_agreement(shown: list[Decimal], true: list[Decimal], told: list[Decimal]) -> None:
    for i, (a, b, e) in enumerate(zip(shown, true, told, strict=True), start=1):
        digits = max(int(one.as_tuple().exponent) for one in (a, b, e))
        if abs(a - b - e) > 2 * Decimal(1).scaleb(digits):
            says = (
                f"Row {i}: indication less reference is {plain(a - b)} g, but the error is stated "
                f"as {plain(e)} g. Look at the certificate before taking any of it."
            )
            raise Unacceptable(says, field="table")


def _grams(column: Column) -> list[Decimal]:
    found = _in_grams(column)
    if found is None:
        units = sorted({one.unit for one in column.amounts})
        says = f"The column “{column.name}” is in {', '.join(units)[:60]}, not in a unit of mass."
        raise Unacceptable(says, field="table")
    return found


def _in_grams(column: Column) -> list[Decimal] | None:
    """Return a column's numbers in g, None where none of its forms is in a unit of mass."""
    found = _mass_form(column)
    return None if found is None else [_scaled(one.value, one) for one in found]


def _mass_form(column: Column) -> tuple[Amount, ...] | None:
    """Return the first of a column's forms whose unit is one of mass."""
    for amounts in (column.amounts, *column.others):
        units = [unit_of(one.unit) for one in amounts]
        if all(one is not None and one[0] == _UNIT for one in units):
            return amounts
    return None


def _scaled(text: str, one: Amount) -> Decimal:
    """Return a number of an amount in the unit that is kept here, with its own digits."""
    unit = unit_of(one.unit)
    return Decimal(text).scaleb(unit[1] if unit else 0)


def _has_u(column: Column) -> bool:
    return any(one.U is not None for one in column.amounts)


def _u(one: Amount) -> Decimal | None:
    """Return the standard uncertainty in g, None where none is stated."""
    if one.U is None:
        return None
    if one.k is None:
        says = f"U = {one.U} is stated without its coverage factor."
        raise Unacceptable(says, field="table")
    k = Decimal(one.k)
    if k <= 0:
        raise Unacceptable(f"The coverage factor {one.k} must be above zero.", field="table")
    return round(_scaled(one.U, one) / k, 15).normalize()


def _check_rising(indications: list[Decimal]) -> None:
    for i, (a, b) in enumerate(pairwise(indications), start=2):
        if a >= b:
            says = f"Row {i}: the indications must rise from row to row."
            raise Unacceptable(says, field="table")


def _sentences(
    rows: tuple[tuple[str, str, str, str | None], ...], measured: Column | None
) -> tuple[str, ...]:
    largest = max(rows, key=lambda row: abs(Decimal(row[1])))
    true = plain(Decimal(largest[0]) + Decimal(largest[2]))
    found = [f"A reading of {largest[0]} g is then taken as {true} g."]
    if measured is None:
        found.append("No indications are listed: they are the loads with their errors.")
    if any(row[3] is None for row in rows):
        found.append("Not every error states an uncertainty: state it yourself.")
    return tuple(found)


def _fragment(rows: tuple[tuple[str, str, str, str | None], ...]) -> dict[str, Any]:
    table = [[row[0], row[2]] for row in rows]
    if Decimal(table[0][0]) > 0:
        table.insert(0, ["0", "0"])
    found: dict[str, Any] = {"error_table": table}
    stated = [Decimal(row[3]) for row in rows if row[3] is not None]
    if len(stated) == len(rows):
        found["error_u"] = {"unit": _UNIT, "u": plain(max(stated))}
    return found
