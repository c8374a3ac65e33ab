"""From the entries of a bench sheet and what it rests on to a bench record."""

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from decimal import Decimal
from itertools import pairwise
from typing import Any

from server.lab.curve_entry import METHOD_SLOT, CurveEntry, read_curve_entry
from server.lab.curve_entry import SLOT as CURVE_SLOT
from server.lab.refusal import Unacceptable

_MASS_SLOTS = {
    "difference": (
        ("container_and_standard", "container with standard"),
        ("container_less_standard", "container less standard"),
    ),
    "tared": (("mass", "mass of standard"),),
}
_AIR_SLOTS = (
    ("air_temperature", "temperature", "Cel", "air temperature"),
    ("air_pressure", "pressure", "hPa", "air pressure"),
    ("air_humidity", "humidity", "%", "air humidity"),
)
_STATEMENT_KEYS = frozenset({"u", "U", "half_width"})
_MICROKELVIN = Decimal("0.000001")


@dataclass(frozen=True, slots=True)
class EntryValue:
    """One slot's standing value, as typed. Replicate 0 is the sheet; segments count from 1.

    The text of a curve's slot is the canonical text that ``server.lab.curve_entry`` reads.
    """

    replicate: int
    slot: str
    segment: int
    text: str
    unit: str | None = None


@dataclass(frozen=True, slots=True)
class SheetMaterials:
    """What a bench sheet rests on, as record fragments, and what was written on it.

    ``standard``, ``solution``, ``reference``, ``balance``, ``burette`` and ``pipette`` are the
    objects of a bench record (``balance`` without ``buoyancy``); ``thermometer`` is
    ``{"reading": bound, "error_table"?}`` (what is added to a reading; the record then holds the
    corrected temperature), ``room`` ``{"temperature", "pressure", "humidity": bound}``; ``blank``
    is the uncertainty statement of a blank that the sheet reads, such as ``{"u": "0.005"}``.
    ``roots`` names the certificate or calibration of ``standard``, ``balance``, ``burette``,
    ``pipette``, ``thermometer``, ``room`` and ``reference``: it becomes the root of every quantity
    that states an uncertainty and names none itself. With ``takes_curve`` each replicate is a
    curve in place of burette readings, and ``end_point`` says how the record wants it read.
    """

    titrant_substance: str
    nominal: str
    burette: Mapping[str, Any]
    entries: tuple[EntryValue, ...]
    medium: str | None = None
    route: str = "weighed"
    ratio: str | None = None
    liquid_expansion: Mapping[str, Any] | None = None
    standard: Mapping[str, Any] | None = None
    solution: Mapping[str, Any] | None = None
    reference: Mapping[str, Any] | None = None
    unknown_in: str | None = None
    balance: Mapping[str, Any] | None = None
    buoyancy: bool = False
    pipette: Mapping[str, Any] | None = None
    thermometer: Mapping[str, Any] | None = None
    temperature_each: bool = False
    room: Mapping[str, Any] | None = None
    repeatability: Mapping[str, Any] | None = None
    blank_kind: str | None = None
    blank: Mapping[str, Any] | None = None
    excess: Mapping[str, Any] | None = None
    replicates_wanted: int = 3
    weighing: str = "difference"
    takes_curve: bool = False
    end_point: Mapping[str, Any] | None = None
    roots: Mapping[str, str] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class Missing:
    """A required entry that is not written yet; replicate 0 is the sheet."""

    replicate: int
    slot: str
    says: str


@dataclass(frozen=True, slots=True)
class Assembled:
    """A bench record once nothing required is missing; ``draft`` is what is there until then.

    ``draft`` has every replicate that was begun, also incomplete ones: it serves running values.
    """

    document: dict[str, Any] | None
    draft: dict[str, Any]
    missing: tuple[Missing, ...]


def assemble(materials: SheetMaterials) -> Assembled:
    """Return the bench record that a sheet's materials make, and what it still misses.

    A replicate counts as begun with its first reading; replicates wanted but not begun are a
    finding's business, not a missing entry. An excluded replicate may stay incomplete.
    """
    written = _Written(materials.entries)
    replicates = [_replicate(materials, written, number) for number in written.begun()]
    draft = {**_frame(materials, written), "replicates": replicates}
    missing = tuple(_missing(materials, written))
    return Assembled(document=None if missing else draft, draft=draft, missing=missing)


class _Written:
    """The sheet's standing values by replicate, slot and segment."""

    def __init__(self, entries: tuple[EntryValue, ...]) -> None:
        self._texts = {
            (one.replicate, one.slot, one.segment): one.text.strip()
            for one in entries
            if one.text.strip()
        }

    def text(self, replicate: int, slot: str, segment: int = 1) -> str | None:
        """Return a value as typed, without the spaces around it."""
        return self._texts.get((replicate, slot, segment))

    def decimal(self, replicate: int, slot: str, segment: int = 1) -> str | None:
        """Return a number as typed, with a point where a comma was typed."""
        text = self.text(replicate, slot, segment)
        return None if text is None else text.replace(",", ".")

    def begun(self) -> list[int]:
        """Return the replicates with at least one reading, in order."""
        return sorted(
            {
                number
                for number, slot, _ in self._texts
                if number > 0
                and slot not in {"remark", "excluded", METHOD_SLOT}
                and ":" not in slot
            }
        )

    def segments(self, replicate: int) -> list[int]:
        """Return the segments of a replicate's burette readings, at least the first."""
        found = {
            segment
            for number, slot, segment in self._texts
            if number == replicate and slot in {"burette_start", "burette_end"}
        }
        return sorted(found | {1})


def _frame(materials: SheetMaterials, written: _Written) -> dict[str, Any]:
    """Return the record's keys that hold for the whole sheet."""
    titrant: dict[str, Any] = {
        "substance": materials.titrant_substance,
        "nominal": {"value": materials.nominal, "unit": "mol/L"},
    }
    if materials.medium is not None:
        titrant["medium"] = materials.medium
    frame: dict[str, Any] = {
        "format": "bench-record/1",
        "titrant": titrant,
        "route": materials.route,
        "ratio": materials.ratio,
        "liquid_expansion": materials.liquid_expansion,
        "standard": _rooted(materials, "standard"),
        "solution": _rooted(materials, "solution"),
        "reference": _rooted(materials, "reference"),
        "unknown_in": materials.unknown_in,
        "balance": _balance(materials),
        "air": _air(materials, written),
        "burette": _rooted(materials, "burette"),
        "pipette": _rooted(materials, "pipette"),
        "temperature": _temperature(materials, written),
        "blank": _blank(materials, written),
        "excess": materials.excess,
        "repeatability": materials.repeatability,
        "end_point": materials.end_point,
    }
    return {key: value for key, value in frame.items() if value is not None}


def _rooted(materials: SheetMaterials, name: str) -> dict[str, Any] | None:
    """Return a fragment whose uncertain quantities name their root."""
    fragment: Mapping[str, Any] | None = getattr(materials, name)
    return None if fragment is None else _with_roots(fragment, materials.roots.get(name))


def _with_roots(fragment: Mapping[str, Any], root: str | None) -> dict[str, Any]:
    """Return a fragment with the root ``<certificate>: <quantity>`` where none is named.

    One paper states several errors that have nothing to do with each other (a balance's linearity
    and the error of its weights), so the paper's number alone would tie too much together.
    """
    rooted = dict(fragment)
    for key, value in fragment.items():
        if root is None or not isinstance(value, Mapping):
            continue
        if key == "flask":
            rooted[key] = _with_roots(value, root)
        elif "id" not in value and _STATEMENT_KEYS & value.keys():
            rooted[key] = {**value, "id": f"{root}: {key.replace('_', ' ')}"}
    return rooted


def _balance(materials: SheetMaterials) -> dict[str, Any] | None:
    balance = _rooted(materials, "balance")
    return None if balance is None else {**balance, "buoyancy": materials.buoyancy}


def _reading(text: str, unit: str, bound: Mapping[str, Any] | None) -> dict[str, Any]:
    """Return a reading with its instrument's statement of uncertainty."""
    return {**(bound or {}), "value": text, "unit": unit}


def _air(materials: SheetMaterials, written: _Written) -> dict[str, Any] | None:
    if not materials.buoyancy:
        return None
    room = _rooted(materials, "room") or {}
    texts = {key: (written.decimal(0, slot), unit) for slot, key, unit, _ in _AIR_SLOTS}
    air = {
        key: _reading(text, unit, room.get(key))
        for key, (text, unit) in texts.items()
        if text is not None
    }
    return air or None


def _temperature(materials: SheetMaterials, written: _Written) -> dict[str, Any] | None:
    """Return the sheet's temperature, or the first replicate's where each has its own."""
    texts = [written.decimal(number, "temperature") for number in (0, *written.begun())]
    text = next((one for one in texts if one is not None), None)
    if text is None:
        return None
    thermometer = _rooted(materials, "thermometer") or {}
    return _reading(_corrected(text, thermometer), "Cel", thermometer.get("reading"))


def _corrected(text: str, thermometer: Mapping[str, Any]) -> str:
    """Return a temperature with what the thermometer's table adds, linear between its points.

    The bench refuses readings outside the table; without a table a reading stays as typed.
    """
    table = [(Decimal(at), Decimal(added)) for at, added in thermometer.get("error_table") or ()]
    reading = Decimal(text)
    for (low, first), (high, second) in pairwise(table):
        if low <= reading <= high:
            added = first + (second - first) * (reading - low) / (high - low)
            return f"{(reading + added).quantize(_MICROKELVIN).normalize():f}"
    return text


def _blank(materials: SheetMaterials, written: _Written) -> dict[str, Any] | None:
    text = written.decimal(0, "blank")
    if text is None or materials.blank_kind is None:
        return None
    return {**_reading(text, "mL", materials.blank), "kind": materials.blank_kind}


def _replicate(materials: SheetMaterials, written: _Written, number: int) -> dict[str, Any]:
    """Return one replicate with what is written of it."""
    found: dict[str, Any] = {"label": str(number)}
    if materials.route == "weighed":
        for slot, _ in _MASS_SLOTS[materials.weighing]:
            found[slot] = written.decimal(number, slot)
        if materials.weighing == "tared":
            found["tare_load"] = written.decimal(number, "tare_load")
    if materials.takes_curve:
        found |= _curve(written, number)
    pairs = [
        [written.decimal(number, "burette_start", one), written.decimal(number, "burette_end", one)]
        for one in written.segments(number)
    ]
    found["burette"] = pairs if all(None not in pair for pair in pairs) else None
    temperature = written.decimal(number, "temperature")
    if temperature is not None:
        temperature = _corrected(temperature, materials.thermometer or {})
    found["temperature"] = temperature
    found["excluded"] = written.text(number, "excluded")
    if found["excluded"] is not None:
        found = _without_half_masses(found)
    return {key: value for key, value in found.items() if value is not None}


def _curve(written: _Written, number: int) -> dict[str, Any]:
    """Return a replicate's curve, and the way in which its end point is to be taken."""
    entry = curve_entry_of(written.text(number, CURVE_SLOT))
    if entry is None:
        return {}
    curve = entry.to_record()
    if entry.drop is not None and entry.drop.u_mL is not None:
        root = entry.drop.instrument or "drops counted"
        drop = {"value": entry.drop.volume_mL, "unit": "mL", "u": entry.drop.u_mL}
        curve["drop"] = {**drop, "id": f"{root}: volume of a drop"}
    return {"curve": curve, "method": written.text(number, METHOD_SLOT)}


def curve_entry_of(raw: str | None) -> CurveEntry | None:
    """Return the curve of an entry, None where there is none or it cannot be read."""
    try:
        return None if raw is None else read_curve_entry(raw)
    except Unacceptable:
        return None


def _without_half_masses(found: dict[str, Any]) -> dict[str, Any]:
    """Return an excluded replicate without a weighing that was never finished: it was spilled."""
    pair = ("container_and_standard", "container_less_standard")
    dropped = {*pair} if any(found.get(key) is None for key in pair) else set()
    if found.get("mass") is None:
        dropped.add("tare_load")
    return {key: value for key, value in found.items() if key not in dropped}


def _missing(materials: SheetMaterials, written: _Written) -> Iterator[Missing]:
    """Yield what is required and not written, sheet first, then replicate by replicate."""
    begun = written.begun()
    each = materials.temperature_each
    if not each and materials.thermometer is not None and written.text(0, "temperature") is None:
        yield Missing(0, "temperature", "The temperature of the titrant is not written yet.")
    if materials.buoyancy:
        for slot, _, _, words in _AIR_SLOTS:
            if written.text(0, slot) is None:
                yield Missing(0, slot, f"The {words} is not written yet; buoyancy needs it.")
    if materials.blank_kind is not None and written.text(0, "blank") is None:
        yield Missing(0, "blank", "The blank is not written yet.")
    if not begun:
        yield Missing(1, "", "No replicate is written yet.")
    for number in begun:
        if written.text(number, "excluded") is None:
            yield from _missing_of_replicate(materials, written, number)


def _missing_of_replicate(
    materials: SheetMaterials, written: _Written, number: int
) -> Iterator[Missing]:
    asked: list[tuple[str, int, str]] = []
    if materials.route == "weighed":
        asked += [(slot, 1, words) for slot, words in _MASS_SLOTS[materials.weighing]]
    if materials.takes_curve:
        asked.append((CURVE_SLOT, 1, "titration curve"))
    for segment in () if materials.takes_curve else written.segments(number):
        after = "" if segment == 1 else f" of filling {segment}"
        asked.append(("burette_start", segment, f"burette start{after}"))
        asked.append(("burette_end", segment, f"burette end{after}"))
    if materials.temperature_each and written.text(0, "temperature") is None:
        asked.append(("temperature", 1, "temperature of the titrant"))
    for slot, segment, words in asked:
        if written.text(number, slot, segment) is None:
            yield Missing(number, slot, f"Replicate {number}: the {words} is not written yet.")
