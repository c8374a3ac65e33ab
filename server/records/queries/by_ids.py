"""Selects by a list of ids, built once: building one takes as long as running it."""

from typing import Any

from sqlalchemy import Select, bindparam, select

#: The parameter of such a select: the list of what is asked for.
IDS = "ids"


def any_of() -> Any:
    """Return what a column may be ``in_``: the list that comes with the call, empty or not."""
    return bindparam(IDS, expanding=True)


def rows_by(column: Any, *order: Any) -> Select[Any]:
    """Return the select of a column's table where the column is one of ``ids``, in an order."""
    return select(column.class_).where(column.in_(any_of())).order_by(*order)
