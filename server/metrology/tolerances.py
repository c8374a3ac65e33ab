"""Maximum permissible errors of volumetric ware: ISO 385, 648, 1042, 8655-2 and 8655-3."""

import json
from collections.abc import Mapping
from dataclasses import dataclass
from decimal import Decimal
from functools import lru_cache
from typing import Any

from server.files import find_folder

BURETTE, PIPETTE, FLASK = "burette", "pipette", "flask"
PISTON_PIPETTE, PISTON_BURETTE = "piston pipette", "piston burette"
WARE_KINDS = (BURETTE, PIPETTE, FLASK, PISTON_PIPETTE, PISTON_BURETTE)
PISTON_KINDS = (PISTON_PIPETTE, PISTON_BURETTE)
_CLASSES = ("A", "AS", "B")
_PER_ML = {"mL": Decimal(1), "uL": Decimal(1000)}


class NoTolerance(LookupError):
    """No table has this ware: ``says`` names what is there, ``about`` the fact to change."""

    def __init__(self, says: str, about: str) -> None:
        super().__init__(says)
        self.says = says
        self.about = about


@dataclass(frozen=True, slots=True)
class Tolerance:
    """Permissible errors in mL at 20 °C, as text; ``random`` None where the standard has none.

    ``row_mL`` is the nominal volume of the row that was taken; ``provenance`` tells how well the
    row is known here.
    """

    kind: str
    row_mL: str
    grade: str | None
    systematic_mL: str
    random_mL: str | None
    standard: str
    provenance: str
    caution: str

    @property
    def row(self) -> str:
        """The row as one would name it."""
        grade = f" class {self.grade}" if self.grade else ""
        return f"{self.standard}{grade}, {self.row_mL} mL"


def tolerance(
    kind: str, nominal_mL: Decimal, *, grade: str | None = None, division_mL: Decimal | None = None
) -> Tolerance:
    """Return the permissible errors of ware of a kind, nominal volume and accuracy class.

    ``grade`` is A, AS or B for glass and None for piston-operated ware; ``division_mL`` the
    distance of a burette's marks. For a piston between two rows the larger row counts.

    Raises:
        NoTolerance: the tables have no such kind, volume, class or division.
    """
    table = tables().get(kind)
    if table is None:
        raise NoTolerance(f"“{kind}” has no table; there are {', '.join(WARE_KINDS)}.", "kind")
    per = _PER_ML[table["unit"]]
    rows = _rows(table, nominal_mL, per)
    if not rows:
        known = ", ".join(_plain(Decimal(one["nominal"]) / per) for one in table["rows"])
        says = f"{table['standard']} has no {kind} of {_plain(nominal_mL)} mL; it has {known} mL."
        raise NoTolerance(says, "nominal")
    row = _of_division(table, rows, division_mL)
    systematic, random = _errors(table, row, grade)
    return Tolerance(
        kind=kind,
        row_mL=_plain(Decimal(row["nominal"]) / per),
        grade=grade if "systematic" not in row else None,
        systematic_mL=_plain(Decimal(systematic) / per),
        random_mL=None if random is None else _plain(Decimal(random) / per),
        standard=table["standard"],
        provenance=table["provenance"],
        caution=table["caution"],
    )


@lru_cache(maxsize=1)
def tables() -> Mapping[str, Any]:
    """Return the tables as they come with the program, by kind of ware."""
    text = (find_folder("seed_data") / "tolerances.json").read_text(encoding="utf-8")
    held: dict[str, Any] = json.loads(text)
    return {kind: held[kind] for kind in WARE_KINDS}


def _rows(table: Mapping[str, Any], nominal_mL: Decimal, per: Decimal) -> list[Mapping[str, Any]]:
    sizes = sorted({Decimal(row["nominal"]) / per for row in table["rows"]})
    if table.get("next_larger"):
        size = next((one for one in sizes if one >= nominal_mL > 0), None)
    else:
        size = nominal_mL
    return [row for row in table["rows"] if Decimal(row["nominal"]) / per == size]


def _of_division(
    table: Mapping[str, Any], rows: list[Mapping[str, Any]], division: Decimal | None
) -> Mapping[str, Any]:
    if "division" not in rows[0]:
        return rows[0]
    known = [row["division"] for row in rows]
    if division is None and len(rows) == 1:
        return rows[0]
    found = [row for row in rows if division is not None and Decimal(row["division"]) == division]
    if not found:
        asked = "its division is not stated" if division is None else f"not of {division} mL"
        says = (
            f"{table['standard']} has burettes of {rows[0]['nominal']} mL with divisions of "
            f"{' and '.join(known)} mL; {asked}."
        )
        raise NoTolerance(says, "division")
    return found[0]


def _errors(
    table: Mapping[str, Any], row: Mapping[str, Any], grade: str | None
) -> tuple[str, str | None]:
    if "systematic" in row:
        return row["systematic"], row["random"]
    known = [one for one in _CLASSES if one in row]
    if grade not in known:
        says = f"{table['standard']} has the classes {', '.join(known)}; pick one."
        raise NoTolerance(says, "class")
    return row[grade], None


def _plain(number: Decimal) -> str:
    return f"{number.normalize():f}"
