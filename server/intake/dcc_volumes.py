"""From a list of a Digital Calibration Certificate to a burette's, pipette's or flask's volumes."""

from dataclasses import dataclass
from decimal import Decimal
from typing import Any

from server.intake.dcc import Table
from server.intake.dcc_errors import (
    MEASURED,
    NOMINAL,
    REFERENCE,
    check_lengths,
    check_rising,
    find_column,
    form_in,
    has_u,
    numbers_in,
    scaled,
    us_in,
)
from server.intake.dcc_quantity import Column, plain
from server.lab.refusal import Unacceptable

_UNIT = "mL"
_AT_20 = "Taken as at 20 °C: look whether the certificate says so."


@dataclass(frozen=True, slots=True)
class VolumeProposal:
    """Volumes as a certificate gives them, for a person to confirm; all in mL as text.

    ``rows`` fit ``heads``; ``fragment`` is what they become in a calibration.
    """

    heads: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]
    sign: str
    says: tuple[str, ...]
    fragment: dict[str, Any]


def volume_tables(tables: tuple[Table, ...], *, several: bool) -> tuple[int, ...]:
    """Return which lists hold delivered or contained volumes, by their place.

    ``several``: a burette's, at readings of its scale; else the one volume of a pipette or flask.
    """
    return tuple(i for i, one in enumerate(tables) if _fits(one, several=several))


def _fits(table: Table, *, several: bool) -> bool:
    found, nominal = _found(table), find_column(table, NOMINAL)
    if found is None or numbers_in(found, _UNIT) is None:
        return False
    if several:
        return nominal is not None and numbers_in(nominal, _UNIT) is not None
    return len(found.amounts) == 1


def _found(table: Table) -> Column | None:
    """Return the volumes that were found: measured, or by a reference."""
    return find_column(table, MEASURED) or find_column(table, REFERENCE)


def burette_proposal(table: Table) -> VolumeProposal:
    """Return the table of corrections that delivered volumes at readings of a burette make.

    The nominal value is the reading; what was delivered beyond it is added to it. A stated error
    is not used: ware's certificates count it in either direction.

    Raises:
        Unacceptable: the columns differ in length, or the readings do not rise.
    """
    nominal, found = find_column(table, NOMINAL), _found(table)
    readings = None if nominal is None else numbers_in(nominal, _UNIT)
    volumes = None if found is None else numbers_in(found, _UNIT)
    if nominal is None or found is None or readings is None or volumes is None:
        says = "The list does not state volumes in mL beside the readings, their nominal values."
        raise Unacceptable(says, field="table")
    check_lengths((nominal, found))
    check_rising(readings)
    us = us_in(found, _UNIT) if has_u(found) else [None] * len(volumes)
    rows = tuple(
        (plain(at), plain(one), plain(one - at), "" if u is None else plain(u))
        for at, one, u in zip(readings, volumes, us, strict=True)
    )
    corrections = [[row[0], row[2]] for row in rows]
    if readings[0] > 0:
        corrections.insert(0, ["0", "0"])
    fragment: dict[str, Any] = {"error_table": corrections}
    stated = [u for u in us if u is not None]
    told = [f"A reading of {rows[-1][0]} mL is then taken as {rows[-1][1]} mL.", _AT_20]
    if len(stated) == len(rows):
        fragment["delivery"] = {"unit": _UNIT, "u": plain(max(stated))}
    else:
        told.append("Not every volume states an uncertainty: state it yourself.")
    return VolumeProposal(
        heads=("reading, mL", "delivered, mL", "added, mL", "u, mL"),
        rows=rows,
        sign="delivered volume less the reading, added to a reading",
        says=tuple(told),
        fragment=fragment,
    )


def volume_proposal(table: Table, key: str) -> VolumeProposal:
    """Return the one volume of a pipette or flask, for ``key`` of its calibration.

    Raises:
        Unacceptable: the list holds none or several, or states U without its coverage factor.
    """
    found = _found(table)
    amounts = None if found is None else form_in(found, _UNIT)
    if found is None or amounts is None or len(amounts) != 1:
        says = "The list does not state one volume in mL."
        raise Unacceptable(says, field="table")
    (one,), (u,) = amounts, us_in(found, _UNIT)
    value = scaled(one.value, one)
    stated: dict[str, str] = {"value": plain(value), "unit": _UNIT}
    told = [_AT_20]
    if u is None or one.U is None or one.k is None:
        told.append("No uncertainty is stated beside it: state it yourself.")
    elif Decimal(one.k) == 1:
        stated["u"] = plain(u)
    else:
        stated |= {"U": plain(scaled(one.U, one)), "k": one.k}
    nominal = find_column(table, NOMINAL)
    at = None if nominal is None else numbers_in(nominal, _UNIT)
    return VolumeProposal(
        heads=("nominal, mL", "volume, mL", "u, mL"),
        rows=((plain(at[0]) if at else "", plain(value), "" if u is None else plain(u)),),
        sign="the volume itself",
        says=tuple(told),
        fragment={key: stated},
    )
