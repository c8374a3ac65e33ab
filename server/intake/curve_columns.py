"""Columns of a curve's table: which holds the volume, the reading, the time, and in which unit."""

import re
from collections.abc import Collection, Mapping, Sequence
from dataclasses import asdict, dataclass
from decimal import Decimal
from itertools import pairwise
from types import MappingProxyType
from typing import Any, Literal

from server.lab.refusal import Unacceptable

Role = Literal["volume", "reading", "time"]
Kind = Literal["pH", "mV"]

VOLUME_UNITS: Mapping[str, Decimal] = MappingProxyType(
    {"mL": Decimal(1), "µL": Decimal("0.001"), "L": Decimal(1000), "drops": Decimal(1)}
)
READING_UNITS: Mapping[str, Decimal] = MappingProxyType(
    {"pH": Decimal(1), "mV": Decimal(1), "V": Decimal(1000)}
)
TIME_UNITS: Mapping[str, Decimal] = MappingProxyType(
    {"s": Decimal(1), "min": Decimal(60), "h": Decimal(3600), "ms": Decimal("0.001")}
)
_NAMES: tuple[tuple[str, tuple[str, ...]], ...] = (
    ("drops", ("drop", "drops", "drop count", "number of drops", "tropfen", "counts")),
    ("volume", ("volume", "vol", "v", "titrant", "titrant volume", "added", "volume added",
                "burette", "burette reading", "volumen", "reagent")),
    ("pH", ("ph", "ph value", "ph reading", "ph-wert")),
    ("mV", ("mv", "potential", "emf", "e", "u", "voltage", "millivolt", "orp", "electrode")),
    ("time", ("time", "t", "seconds", "second", "sec", "elapsed", "elapsed time", "zeit")),
)  # fmt: skip
_UNITS: Mapping[str, str] = MappingProxyType(
    {
        "ml": "mL", "cm3": "mL", "cm³": "mL", "µl": "µL", "μl": "µL", "ul": "µL", "l": "L",
        "dm3": "L", "mv": "mV", "s": "s", "sec": "s", "seconds": "s", "min": "min",
        "minutes": "min", "h": "h", "ms": "ms", "drops": "drops", "ph": "pH",
    }
)  # fmt: skip
_MOST_pH = 14
_HEADER = re.compile(
    r"(?P<name>[^,(\[/]*?)\s*(?:[,/]\s*(?P<after>[^()\[\]]+)|[(\[]\s*(?P<inside>[^)\]]*)[)\]])?\s*"
)


@dataclass(frozen=True, slots=True)
class ColumnMapping:
    """Which column (from 0) holds what: the part that is remembered for an instrument.

    ``kind`` is what was read; ``time`` is None where no column holds seconds.
    """

    volume: int
    reading: int
    kind: Kind
    time: int | None = None
    volume_unit: str = "mL"
    reading_unit: str = "pH"
    time_unit: str = "s"

    def to_document(self) -> dict[str, Any]:
        """Return the mapping as a JSON-able document."""
        return asdict(self)

    @property
    def last(self) -> int:
        """The last column that is needed."""
        return max(self.volume, self.reading, self.time or 0)


def mapping_from(document: Mapping[str, Any]) -> ColumnMapping:
    """Return a remembered mapping.

    Raises:
        Unacceptable: a key or a value of it is not known.
    """
    known = {"volume", "reading", "kind", "time", "volume_unit", "reading_unit", "time_unit"}
    for key in document:
        if key not in known:
            raise Unacceptable(f"A column mapping has no {key!r}.", field=f"mapping.{key}")
    columns = {}
    for role in ("volume", "reading", "time"):
        value = document.get(role)
        if value is None and role == "time":
            continue
        if isinstance(value, bool) or not isinstance(value, int) or not 0 <= value < 50:
            says = f"mapping.{role} must be the number of a column, from 0."
            raise Unacceptable(says, field=f"mapping.{role}", example="0")
        columns[role] = value
    if len(set(columns.values())) < len(columns):
        raise Unacceptable("One column cannot hold two things.", field="mapping.reading")
    kind = document.get("kind")
    if kind not in ("pH", "mV"):
        raise Unacceptable("mapping.kind must be pH or mV.", field="mapping.kind", example="pH")
    units = (
        ("volume_unit", VOLUME_UNITS, "mL"),
        ("reading_unit", READING_UNITS, kind),
        ("time_unit", TIME_UNITS, "s"),
    )
    taken: dict[str, str] = {}
    for key, known_units, usual in units:
        unit = document.get(key, usual)
        taken[key] = unit if isinstance(unit, str) else ""
        if taken[key] not in known_units:
            says = f"mapping.{key} must be one of {', '.join(known_units)}."
            raise Unacceptable(says, field=f"mapping.{key}", example=usual)
    if (taken["reading_unit"] == "pH") != (kind == "pH"):
        says = f"Readings of kind {kind} are not in {taken['reading_unit']}."
        raise Unacceptable(says, field="mapping.reading_unit", example=kind)
    return ColumnMapping(columns["volume"], columns["reading"], kind, columns.get("time"), **taken)


@dataclass(frozen=True, slots=True)
class RememberedColumns:
    """How an instrument's files had their columns last: the mapping and the header it was for."""

    mapping: ColumnMapping
    header: tuple[str, ...] | None
    width: int

    def fits(self, header: Sequence[str] | None, width: int) -> bool:
        """Tell whether a table is of the same make: the same header, or none and as many columns.

        Another header may have the columns in another order; it is read afresh.
        """
        if header is None or self.header is None:
            return header is None and self.header is None and width == self.width
        return tuple(_folded(header)) == tuple(_folded(self.header))

    def to_document(self) -> dict[str, Any]:
        """Return it as a JSON-able document."""
        header = None if self.header is None else list(self.header)
        return {"mapping": self.mapping.to_document(), "header": header, "width": self.width}


def _folded(header: Sequence[str]) -> list[str]:
    cells = [" ".join(one.lower().split()) for one in header]
    while cells and not cells[-1]:
        cells.pop()
    return cells


def remembered_from(document: Mapping[str, Any]) -> RememberedColumns:
    """Return what was remembered, from its document.

    Raises:
        Unacceptable: it is no such document.
    """
    mapping, header = document.get("mapping"), document.get("header")
    if not isinstance(mapping, Mapping):
        raise Unacceptable("mapping must be an object.", field="mapping")
    names = None if header is None else tuple(str(one) for one in header)
    return RememberedColumns(mapping_from(mapping), names, int(document.get("width") or 0))


def columns_of(
    header: Sequence[str] | None, values: Sequence[Sequence[Decimal | None]]
) -> tuple[ColumnMapping, list[str]]:
    """Return the mapping that a header tells, or the order of the columns, and words on it.

    ``values`` are some rows as numbers, by which a kind that no header names is told.

    Raises:
        Unacceptable: the header names no volume or no reading.
    """
    width = max(len(row) for row in values)
    if header is None:
        if width > 2 and _counts(values):
            kind = _kind_of(values, 2)
            says = "No header: column 1 counts the points, column 2 taken as the volume in mL, "
            return ColumnMapping(1, 2, kind, reading_unit=kind), [f"{says}column 3 as {kind}."]
        kind = _kind_of(values, 1)
        says = f"No header: column 1 taken as the volume in mL, column 2 as {kind}" + (
            ", column 3 as seconds." if width > 2 else "."
        )
        return ColumnMapping(0, 1, kind, 2 if width > 2 else None, reading_unit=kind), [says]
    found: dict[str, tuple[int, str | None]] = {}
    words: list[str] = []
    passed = []
    for at, text in enumerate(header):
        role, unit = _role(text)
        if role is None:
            if text.strip():
                passed.append(f"“{text.strip()[:40]}”")
            continue
        if role in found:
            passed.append(f"“{text.strip()[:40]}” (a second {role})")
            continue
        found[role] = (at, unit)
    if passed:
        words.append(f"Columns passed over: {', '.join(passed)}.")
    return _mapped(found, header, values, words), words


def _mapped(
    found: dict[str, tuple[int, str | None]],
    header: Sequence[str],
    values: Sequence[Sequence[Decimal | None]],
    words: list[str],
) -> ColumnMapping:
    volume_at, volume_unit = found.get("volume") or found.get("drops") or (None, None)
    if volume_at is None:
        said = ", ".join(f"“{one.strip()[:30]}”" for one in header if one.strip())
        says = f"No column is named as the volume; the header has {said}."
        raise Unacceptable(says, field="file", example="volume (mL), pH")
    if "volume" not in found:
        volume_unit = "drops"
    kind: Kind = "pH" if "pH" in found else "mV"
    if kind not in found:
        others = [at for at in range(len(header)) if at not in {one for one, _ in found.values()}]
        if "time" in found or len(others) != 1:
            says = "No column is named as pH or mV."
            raise Unacceptable(says, field="file", example="volume (mL), pH")
        kind = _kind_of(values, others[0])
        found[kind] = (others[0], None)
        words.append(f"“{header[others[0]].strip()[:40]}” taken as the reading in {kind}.")
    if "pH" in found and "mV" in found:
        words.append("Both pH and mV are there; pH is taken.")
    reading_at, reading_unit = found[kind]
    time_at, time_unit = found.get("time", (None, None))
    mapping = ColumnMapping(
        volume_at,
        reading_at,
        kind,
        time_at,
        volume_unit=_known(volume_unit, VOLUME_UNITS, "mL"),
        reading_unit="pH" if kind == "pH" else _known(reading_unit, ("mV", "V"), "mV"),
        time_unit=_known(time_unit, TIME_UNITS, "s"),
    )
    words.insert(0, taken_words(mapping, header))
    return mapping


def taken_words(mapping: ColumnMapping, header: Sequence[str] | None) -> str:
    """Return in a sentence which column is taken as what."""

    def named(at: int) -> str:
        name = header[at].strip() if header is not None and at < len(header) else ""
        return f"“{name[:40]}”" if name else f"column {at + 1}"

    names = [
        f"volume in {mapping.volume_unit} from {named(mapping.volume)}",
        f"{mapping.reading_unit} from {named(mapping.reading)}",
    ]
    if mapping.time is not None:
        names.append(f"time in {mapping.time_unit} from {named(mapping.time)}")
    return f"Taken: {', '.join(names)}."


def _counts(values: Sequence[Sequence[Decimal | None]]) -> bool:
    """Tell whether the first of three columns only numbers the points: 1, 2, 3 and on.

    The second must grow as volumes do, and the third be what seconds are not: a pH throughout, or
    readings that fall.
    """
    columns = []
    for at in range(3):
        column = [row[at] for row in values if len(row) > at]
        known = [one for one in column if one is not None]
        if len(known) < len(values):
            return False
        columns.append(known)
    count, volume, reading = columns
    numbered = count[0] in {0, 1} and all(b - a == 1 for a, b in pairwise(count))
    grows = all(a <= b for a, b in pairwise(volume))
    falls = any(a > b for a, b in pairwise(reading))
    return numbered and grows and (falls or 0 <= reading[0] <= reading[-1] <= _MOST_pH)


def _known(unit: str | None, units: Collection[str], usual: str) -> str:
    return unit if unit is not None and unit in units else usual


def _role(text: str) -> tuple[str | None, str | None]:
    """Return what a header's cell names, and its unit where it states one."""
    shaped = _HEADER.fullmatch(text.strip())
    if shaped is None:
        return None, None
    name = " ".join(shaped["name"].lower().replace("_", " ").split())
    stated = (shaped["after"] or shaped["inside"] or "").strip()
    unit = "V" if stated == "V" else _UNITS.get(stated.lower())
    for role, names in _NAMES:
        if name in names:
            return role, unit
    words = name.split()
    if words and (trailing := _UNITS.get(words[-1])) is not None:
        # “volume ml”, “time s”, or a unit alone
        unit, name = trailing, " ".join(words[:-1])
        for role, names in _NAMES:
            if name in names:
                return role, unit
    for units, role in ((VOLUME_UNITS, "volume"), (TIME_UNITS, "time")):
        if unit in units:
            return ("drops" if unit == "drops" else role), unit
    if unit in {"mV", "V"}:
        return "mV", unit
    return None, None


def _kind_of(values: Sequence[Sequence[Decimal | None]], at: int) -> Kind:
    """Return pH where all readings could be, mV otherwise."""
    readings = [row[at] for row in values if len(row) > at]
    return "pH" if all(one is not None and -1 <= one <= 15 for one in readings) else "mV"
