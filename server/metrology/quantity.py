"""A quantity: value, unit and one statement of uncertainty (VIM 1.1, 2.26)."""

import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from server.metrology.decimal_text import DecimalProblem, read_wire_decimal

#: Divisor of a half-width a by shape: u = a / divisor (JCGM 100, 4.3.7 to 4.3.9; JCGM 101, 6.4).
DIVISORS: Mapping[str, float] = {
    "rectangular": math.sqrt(3.0),
    "triangular": math.sqrt(6.0),
    "arcsine": math.sqrt(2.0),
}
_KEYS = ("value", "unit", "u", "U", "k", "half_width", "shape", "dof", "source", "id")
_EXAMPLE = '{"value": "20.00", "unit": "mL", "U": "0.02", "k": "2"}'


class QuantityProblem(ValueError):
    """A quantity that cannot be read: where (``path``), what is wrong, and what would do."""

    def __init__(self, path: str, says: str, example: str | None = _EXAMPLE) -> None:
        super().__init__(f"{path}: {says}")
        self.path = path
        self.says = says
        self.example = example


@dataclass(frozen=True, slots=True)
class Statement:
    """A statement of uncertainty: standard uncertainty u, its dof (None: ∞), shape, half-width."""

    u: float
    dof: float | None = None
    shape: str = "normal"
    half_width: float | None = None


@dataclass(frozen=True, slots=True)
class Quantity:
    """A value in a unit with its statement of uncertainty; ``id`` is the root it comes from.

    ``value`` is None for a bound, ``unit`` None for a pure number, ``statement`` None where the
    value is taken as exact.
    """

    value: float | None
    unit: str | None
    statement: Statement | None = None
    source: str | None = None
    id: str | None = None

    @property
    def u(self) -> float:
        """Standard uncertainty in the quantity's unit, 0 without a statement."""
        return self.statement.u if self.statement else 0.0


def read_quantity(
    document: Any, path: str, *, unit: str | None, needs_value: bool = True
) -> Quantity:
    """Return the quantity that an object of a record states, in the unit that its place asks for.

    ``unit`` None asks for a pure number. Numbers travel as text.

    Raises:
        QuantityProblem: unknown key, wrong unit, no value, two statements of uncertainty, a number
            that cannot be.
    """
    if not isinstance(document, Mapping):
        raise QuantityProblem(path, "This must be an object with value and unit.")
    for key in document:
        if key not in _KEYS:
            says = f"This key is not known here. Known keys: {', '.join(_KEYS)}."
            raise QuantityProblem(f"{path}.{key}", says)
    reader = _Reader(document, path)
    reader.check_unit(unit)
    value = reader.number("value")
    if value is None and needs_value:
        raise QuantityProblem(f"{path}.value", "The value is missing.", '"20.00"')
    return Quantity(
        value=value,
        unit=unit,
        statement=reader.statement(),
        source=reader.text("source"),
        id=reader.text("id"),
    )


class _Reader:
    """The keys of one quantity, read with their paths."""

    def __init__(self, document: Mapping[str, Any], path: str) -> None:
        self._document = document
        self._path = path

    def check_unit(self, unit: str | None) -> None:
        given = self._document.get("unit")
        if unit is None and given in {None, "", "1"}:
            return
        if given != unit:
            wanted = "no unit: it is a pure number" if unit is None else f'the unit "{unit}"'
            found = "none is given" if given is None else f"{str(given)[:20]!r} is given"
            says = f"This takes {wanted}; {found}."
            raise QuantityProblem(f"{self._path}.unit", says, unit and f'"{unit}"')

    def number(self, key: str) -> float | None:
        text = self._document.get(key)
        if text is None:
            return None
        where = f"{self._path}.{key}"
        if not isinstance(text, str):
            says = "Write the number as text, with all digits as they were read."
            raise QuantityProblem(where, says, '"20.00"')
        try:
            return float(read_wire_decimal(text, where))
        except DecimalProblem as problem:
            raise QuantityProblem(where, problem.says, problem.example) from problem

    def text(self, key: str) -> str | None:
        value = self._document.get(key)
        if value is not None and not isinstance(value, str):
            raise QuantityProblem(f"{self._path}.{key}", "This must be a text.", '"C-1182"')
        return value or None

    def statement(self) -> Statement | None:
        stated = [key for key in ("u", "U", "half_width") if self._document.get(key) is not None]
        if len(stated) > 1:
            says = f"Both {stated[0]} and {stated[1]} are stated; keep one."
            raise QuantityProblem(f"{self._path}.{stated[1]}", says)
        dof = self._positive("dof")
        self._check_company(stated[0] if stated else None)
        if not stated:
            return None
        size = self._size(stated[0])
        if stated[0] == "half_width":
            shape = str(self._document["shape"])
            return Statement(size / DIVISORS[shape], dof, shape, size)
        divisor = 1.0 if stated[0] == "u" else self._positive("k") or 1.0
        return Statement(size / divisor, dof)

    def _size(self, key: str) -> float:
        size = self.number(key)
        if size is None or size < 0:
            says = "An uncertainty cannot be negative."
            raise QuantityProblem(f"{self._path}.{key}", says, '"0.02"')
        return size

    def _positive(self, key: str) -> float | None:
        number = self.number(key)
        if number is not None and number <= 0:
            raise QuantityProblem(f"{self._path}.{key}", "This must be above zero.", '"2"')
        return number

    def _check_company(self, stated: str | None) -> None:
        """Refuse a U without k, a half-width without shape, and what belongs to neither."""
        k, shape = self._document.get("k"), self._document.get("shape")
        if stated == "U" and k is None:
            says = "An expanded uncertainty U needs its coverage factor k."
            raise QuantityProblem(f"{self._path}.k", says, '"2"')
        if stated == "half_width" and shape not in DIVISORS:
            says = f"A half-width needs its shape: one of {', '.join(DIVISORS)}."
            raise QuantityProblem(f"{self._path}.shape", says, '"rectangular"')
        for key, value, owner in (("k", k, "U"), ("shape", shape, "half_width")):
            if value is not None and stated != owner:
                says = f"{key} goes with {owner} only."
                raise QuantityProblem(f"{self._path}.{key}", says)
