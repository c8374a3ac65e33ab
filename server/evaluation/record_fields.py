"""The fields of a bench record, read one by one: each refusal names its path and an example."""

import re
from collections.abc import Collection, Mapping, Sequence
from difflib import get_close_matches
from fractions import Fraction
from itertools import pairwise
from typing import Any, NoReturn

from server.metrology.decimal_text import DecimalProblem, read_wire_decimal
from server.metrology.quantity import Quantity, QuantityProblem, read_quantity

_RATIO = re.compile(r"[0-9]{1,9}([./][0-9]{1,9})?")

Table = tuple[tuple[float, float], ...]


class RecordProblem(Exception):
    """A bench record that cannot be read: where (``path``), what is wrong, and what would do."""

    def __init__(self, path: str, says: str, example: str | None = None) -> None:
        super().__init__(f"{path}: {says}")
        self.path = path
        self.says = says
        self.example = example

    def to_document(self) -> dict[str, str | None]:
        """Return the problem as a JSON-able document."""
        return {"path": self.path, "says": self.says, "example": self.example}


class Fields:
    """The keys of one object of a record; a key that is not known is refused by its path."""

    def __init__(self, document: Any, path: str, known: Collection[str]) -> None:
        if not isinstance(document, Mapping):
            raise RecordProblem(path or "(record)", "This must be an object.", "{ ... }")
        self.document = document
        self.path = path
        for key in document:
            if key not in known:
                self._refuse_key(str(key), known)

    def _refuse_key(self, key: str, known: Collection[str]) -> NoReturn:
        near = get_close_matches(key, known, n=1)
        hint = f" Did you mean {near[0]!r}?" if near else ""
        says = f"This key is not known here.{hint} Known keys: {', '.join(sorted(known))}."
        raise RecordProblem(self.at(key), says, near[0] if near else min(known))

    def at(self, key: str) -> str:
        """Return the path of a key."""
        return f"{self.path}.{key}" if self.path else key

    def has(self, key: str) -> bool:
        """Tell whether a key is there and not null."""
        return self.document.get(key) is not None

    def refuse(self, key: str, says: str, example: str | None = None) -> NoReturn:
        """Refuse the record because of a key."""
        raise RecordProblem(self.at(key), says, example)

    def need(self, key: str, example: str) -> Any:
        """Return what a required key holds."""
        if not self.has(key):
            self.refuse(key, "This is required and missing.", example)
        return self.document[key]

    def text(self, key: str, example: str, *, required: bool = True) -> str | None:
        """Return a key's text, None where it may be and is absent."""
        if not required and not self.has(key):
            return None
        value = self.need(key, example)
        if not isinstance(value, str) or not value.strip():
            self.refuse(key, "This must be a text that is not empty.", example)
        return value

    def choice(self, key: str, choices: Sequence[str], *, default: str | None = None) -> str:
        """Return one of a few words."""
        if default is not None and not self.has(key):
            return default
        value = self.need(key, choices[0])
        if value not in choices:
            words = ", ".join(f'"{one}"' for one in choices)
            self.refuse(key, f"{value!r} is none of {words}.", choices[0])
        return str(value)

    def flag(self, key: str, *, default: bool = False) -> bool:
        """Return true or false."""
        value = self.document.get(key, default)
        if not isinstance(value, bool):
            self.refuse(key, "This must be true or false, without quotation marks.", "true")
        return value

    def decimal(self, key: str, example: str) -> float | None:
        """Return a decimal that travels as text, None where it is absent."""
        if not self.has(key):
            return None
        return decimal_at(self.document[key], self.at(key), example)

    def quantity(self, key: str, unit: str | None, *, needs_value: bool = True) -> Quantity | None:
        """Return a quantity in the unit that this place asks for, None where it is absent."""
        if not self.has(key):
            return None
        try:
            return read_quantity(
                self.document[key], self.at(key), unit=unit, needs_value=needs_value
            )
        except QuantityProblem as problem:
            raise RecordProblem(problem.path, problem.says, problem.example) from problem

    def bound(self, key: str, unit: str) -> Quantity | None:
        """Return the bound of an error that is estimated as zero, None where it is absent."""
        found = self.quantity(key, unit, needs_value=False)
        if found is not None and found.value:
            says = "This is the bound of an error around zero; leave its value out."
            example = f'{{"unit": "{unit}", "half_width": "0.03", "shape": "rectangular"}}'
            self.refuse(f"{key}.value", says, example)
        return found

    def need_quantity(self, key: str, unit: str | None) -> Quantity:
        """Return a required quantity with a value above zero."""
        self.need(key, quantity_example(unit))
        found = self.quantity(key, unit)
        if found is None or value_of(found) <= 0:
            self.refuse(f"{key}.value", "This must be above zero.", quantity_example(unit))
        return found

    def error_table(self, key: str, first: str) -> Table:
        """Return a table of readings and errors, in rising order; empty where it is absent."""
        if not self.has(key):
            return ()
        rows, example = self.document[key], '[["0", "0"], ["10", "0.003"]]'
        if not isinstance(rows, Sequence) or isinstance(rows, str) or len(rows) < 2:
            self.refuse(key, "An error table needs at least two rows of two values.", example)
        table = tuple(
            pair_at(row, f"{self.at(key)}[{i}]", '["10", "0.003"]') for i, row in enumerate(rows)
        )
        for i, (low, high) in enumerate(pairwise(table), start=1):
            if high[0] <= low[0]:
                where = f"{key}[{i}][0]"
                self.refuse(where, f"Each {first} must be above the one before it.", example)
        return table

    def ratio(self, key: str) -> Fraction | None:
        """Return the amount of titrant per amount of standard, None where it is absent."""
        text = self.text(key, "2/5", required=False)
        if text is None:
            return None
        try:
            ratio = Fraction(text) if _RATIO.fullmatch(text) else Fraction(0)
        except ZeroDivisionError:
            ratio = Fraction(0)
        if ratio <= 0:
            self.refuse(key, f"{text!r} is no ratio: whole numbers, or one over another.", "2/5")
        return ratio


def decimal_at(value: Any, path: str, example: str) -> float:
    """Return a decimal given as text; a bare number is refused, for it has lost its digits."""
    if isinstance(value, bool) or not isinstance(value, str):
        says = "Write the number as text, with all digits as they were read."
        raise RecordProblem(path, says, f'"{example}"')
    try:
        return float(read_wire_decimal(value, path))
    except DecimalProblem as problem:
        raise RecordProblem(path, problem.says, problem.example or f'"{example}"') from problem


def pair_at(row: Any, path: str, example: str) -> tuple[float, float]:
    """Return a pair of decimals given as text."""
    if not isinstance(row, Sequence) or isinstance(row, str) or len(row) != 2:
        raise RecordProblem(path, "This must be a pair of two values.", example)
    return decimal_at(row[0], f"{path}[0]", "10"), decimal_at(row[1], f"{path}[1]", "0.003")


def value_of(quantity: Quantity) -> float:
    """Return the value of a quantity that was read with one."""
    assert quantity.value is not None  # noqa: S101 - read_quantity has made sure of it
    return quantity.value


def quantity_example(unit: str | None) -> str:
    """Return a quantity that would be taken in this unit."""
    return '{"value": "0.9998"}' if unit is None else f'{{"value": "20.00", "unit": "{unit}"}}'
