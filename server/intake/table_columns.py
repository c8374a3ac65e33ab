"""Columns of a calibration's table: what each holds and in which unit, told from its header."""

import re
from collections.abc import Mapping
from dataclasses import dataclass
from decimal import Decimal
from types import MappingProxyType

from server.intake.table_text import CellGrid
from server.lab.refusal import Unacceptable

ERROR = "error"
#: The unit in which each kind's table is kept.
BASE_UNITS: Mapping[str, str] = MappingProxyType(
    {"balance": "g", "burette": "mL", "thermometer": "Cel"}
)
#: Power of ten by which a unit becomes the kind's own.
_POWERS: Mapping[str, Mapping[str, int]] = MappingProxyType(
    {
        "balance": {"kg": 3, "g": 0, "mg": -3, "ug": -6, "µg": -6, "μg": -6},
        "burette": {"l": 3, "ml": 0, "cm3": 0, "cm³": 0, "ul": -3, "µl": -3, "μl": -3},
        "thermometer": {"cel": 0, "°c": 0, "c": 0, "k": 0, "degc": 0, "mk": -3},
    }
)
_ROLES: Mapping[str, tuple[str, ...]] = MappingProxyType(
    {
        "reading": ("reading", "indication", "load", "nominal", "nominal value", "point", "volume",
                    "temperature", "measured", "measured value"),
        "reference": ("reference", "reference value", "conventional", "conventional mass",
                      "conventional value", "true value", "delivered", "v20", "actual"),
        "correction": ("correction", "added"),
        "error": ("error", "error of indication", "deviation", "measurement error"),
        "u": ("standard uncertainty",),
        "U": ("expanded uncertainty",),
        "k": ("k", "coverage factor"),
    }
)  # fmt: skip
_HEADER = re.compile(
    r"(?P<name>[^,(\[/]+?)\s*(?:(?:,|/|\bin\b)\s*(?P<after>[^()\[\]]+?)|[(\[]\s*(?P<inside>[^)\]]+?)"
    r"\s*[)\]])?",
)


#: A coverage factor in a header: “U (k = 2), mg”.
_FACTOR = re.compile(r"[(\[]?\s*\bk\s*=\s*(?P<k>[1-9][0-9]{0,2}(?:[.,][0-9]{1,4})?)\s*[)\]]?")


@dataclass(frozen=True, slots=True)
class Column:
    """A column: where it stands, its header, and the power of ten to the kind's own unit.

    ``k`` is the coverage factor where the header of an expanded uncertainty states it.
    """

    index: int
    label: str
    power: int
    says: str
    k: Decimal | None = None

    @property
    def words(self) -> str:
        """The header, and where it stands."""
        return f"column {self.index + 1}, “{self.label}”"


def read_columns(grid: CellGrid, kind: str) -> dict[str, Column]:
    """Return the columns of a table by role; a column that is not known is left and told.

    Raises:
        Unacceptable: a role stands twice, no reading, nothing that tells an error, a unit that does
            not fit.
    """
    found: dict[str, Column] = {}
    unknown = []
    for i, text in enumerate(grid.header):
        role, unit = _role(text)
        if role is None:
            unknown.append(f"{grid.where(grid.header_row, i)} “{text[:40]}”")
            continue
        if role in found:
            says = f"{grid.where(grid.header_row, i)}: there is a column “{role}” already."
            raise Unacceptable(says, field="file")
        found[role] = _column(grid, i, role=role, unit=unit, kind=kind)
    told = f" Not known: {', '.join(unknown)}." if unknown else ""
    if "reading" not in found:
        says = f"No column holds the readings; name it reading, indication or load.{told}"
        raise Unacceptable(says, field="file", example=_example(kind))
    ways = [role for role in ("correction", ERROR, "reference") if role in found]
    if not ways:
        says = f"No column tells the error; name it correction, error or reference.{told}"
        raise Unacceptable(says, field="file", example=_example(kind))
    if unknown:
        first = found["reading"]
        found["reading"] = Column(
            first.index, first.label, first.power, f"{first.says}{told}".strip()
        )
    return found


def scaled(value: Decimal, column: Column) -> Decimal:
    """Return a value in the kind's own unit, with the digits that it has."""
    return value.scaleb(column.power) if column.power else value


def decimal_text(value: Decimal) -> str:
    """Return a decimal as plain text with its own zeros, and no minus before zero."""
    return f"{abs(value) if value == 0 else value:f}"


def _example(kind: str) -> str:
    unit = BASE_UNITS[kind]
    return f"reading, {unit}; correction, {unit}; U, {unit}; k"


def _role(text: str) -> tuple[str | None, str | None]:
    shaped = _HEADER.fullmatch(_FACTOR.sub(" ", text).strip())
    if not shaped:
        return None, None
    name, unit = shaped["name"].strip(), shaped["after"] or shaped["inside"]
    if name in {"u", "U", "k"}:
        return name, unit
    words = " ".join(name.lower().split())
    for role, names in _ROLES.items():
        if words in names:
            return role, unit
    return None, None


def _column(grid: CellGrid, index: int, *, role: str, unit: str | None, kind: str) -> Column:
    label = grid.header[index]
    if role == "k":
        return Column(index, label, 0, "")
    stated = _FACTOR.search(label) if role == "U" else None
    k = Decimal(stated["k"].replace(",", ".")) if stated else None
    if unit is None:
        says = f"“{label[:40]}” names no unit; {BASE_UNITS[kind]} is taken."
        return Column(index, label, 0, says, k)
    power = _POWERS[kind].get(unit.strip().lower())
    scale = kind == "thermometer" and role in {"reading", "reference"}
    if power is None or (scale and unit.strip().lower() in {"k", "mk"}):
        known = ", ".join(_POWERS[kind])
        says = (
            f"{grid.where(grid.header_row, index)}: “{unit[:20]}” is no unit of a {kind}’s "
            f"{role}; known are {known}."
        )
        raise Unacceptable(says, field="file", example=_example(kind))
    return Column(index, label, power, "", k)
