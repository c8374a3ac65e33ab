"""A gravimetric run as it was typed: ware, water, air, weighing by weighing."""

import math
from collections.abc import Mapping
from dataclasses import dataclass
from decimal import Decimal
from types import MappingProxyType
from typing import Any

from server.lab import reading_documents as reading
from server.lab.calibration.typed_numbers import (
    bound_at,
    corrected,
    error_input,
    list_at,
    number_at,
    optional_number,
    read_table,
)
from server.lab.refusal import Unacceptable
from server.metrology.conformity import RULES, SIMPLE
from server.metrology.gravimetry import Air, Ware, WaterWeighing
from server.metrology.propagation import Input
from server.metrology.tolerances import BURETTE, PISTON_BURETTE, WARE_KINDS

MOST_WEIGHINGS = 200
WATERS = ("air-saturated", "degassed")
#: Cubic expansion γ per K by material: ISO 4787, from memory.
EXPANSIONS: Mapping[str, str] = MappingProxyType(
    {"borosilicate glass 3.3": "9.9e-6", "soda-lime glass": "2.7e-5"}
)
_KEYS = (
    "kind", "nominal", "class", "division", "water", "glass_expansion", "air", "weighings",
    "evaporation", "uncertainty", "balance", "rule",
)  # fmt: skip
_WEIGHING_KEYS = ("before", "after", "net", "water", "air", "minutes", "point", "left_out")
_BALANCE_KEYS = ("linearity", "error_table", "error_u")
_AIR = {"temperature": ("21.3", "0", "50"), "pressure": ("1003.1", "500", "1100"),
        "humidity": ("46", "0", "100")}  # fmt: skip
#: What the budget takes as bounds, by key, with its unit.
_BOUNDS = {
    "weighing": "g", "water_temperature": "Cel", "water_density": None, "air_temperature": "Cel",
    "air_pressure": "hPa", "air_humidity": "%", "glass_expansion": "1/K", "evaporation": "g/min",
}  # fmt: skip


@dataclass(frozen=True, slots=True)
class TypedWeighing:
    """One weighing: what was weighed, at which reading of a burette, and why it was left out."""

    index: int
    weighing: WaterWeighing
    point: Decimal | None
    left_out: str


@dataclass(frozen=True, slots=True)
class WaterRun:
    """A gravimetric run; ``nominal`` in mL is the capacity of a burette, the volume of others.

    ``errors`` are the inputs of the budget that all weighings share; ``unstated`` the keys of those
    that nobody stated.
    """

    kind: str
    nominal: Decimal
    grade: str | None
    division: Decimal | None
    glass_expansion: str
    ware: Ware
    weighings: tuple[TypedWeighing, ...]
    errors: tuple[Input, ...]
    unstated: tuple[str, ...]
    rule: str

    @property
    def counting(self) -> tuple[TypedWeighing, ...]:
        """The weighings that were not left out."""
        return tuple(one for one in self.weighings if not one.left_out)

    @property
    def has_points(self) -> bool:
        """Whether the ware has a scale that is weighed at several readings."""
        return self.kind in {BURETTE, PISTON_BURETTE}


def read_water_run(document: Any) -> WaterRun:
    """Return a gravimetric run from its document; every number is text as typed.

    Keys: ``kind`` (burette, pipette, flask, piston pipette, piston burette), ``nominal`` mL,
    ``class`` (A, AS, B; none for pistons), ``division`` mL (burettes), ``water`` (air-saturated or
    degassed), ``glass_expansion`` per K, ``air`` {temperature °C, pressure hPa, humidity %},
    ``weighings`` [{before and after g, or net g; water °C; air?; minutes?; point mL (burettes);
    left_out: reason?}], ``evaporation`` {rate g/min, minutes}, ``uncertainty`` {bounds by name},
    ``balance`` (the calibration that serves), ``rule`` (the decision rule).

    Raises:
        Unacceptable: an unknown key, a missing or impossible value, named by its path.
    """
    doc = reading.known_keys(document, "", _KEYS)
    kind = reading.choice_at(doc, "kind", "", choices=WARE_KINDS)
    expansion = number_at(doc, "glass_expansion", "", example="9.9e-6", low="0", high="0.001")
    rate, minutes = _evaporation(doc)
    ware = Ware(
        glass_expansion=float(expansion),
        air_saturated=reading.choice_at(doc, "water", "", choices=WATERS) == WATERS[0],
        evaporation_g_min=rate,
    )
    rows = list_at(doc, "weighings", "", least=1, most=MOST_WEIGHINGS, what="weighings")
    frame = _Frame(
        air=doc.get("air"), minutes=minutes, has_points=kind in {BURETTE, PISTON_BURETTE},
        balance=reading.known_keys(doc.get("balance") or {}, "balance", _BALANCE_KEYS),
        nominal=number_at(doc, "nominal", "", example="10", low="0.0001", high="10000"),
    )  # fmt: skip
    errors, unstated = _errors(doc, frame.balance, evaporates=rate > 0)
    return WaterRun(
        kind=kind,
        nominal=frame.nominal,
        grade=_grade(doc, kind),
        division=optional_number(doc, "division", "", example="0.05", low="0"),
        glass_expansion=str(doc["glass_expansion"]).strip(),
        ware=ware,
        weighings=tuple(frame.weighing(row, i) for i, row in enumerate(rows)),
        errors=errors,
        unstated=unstated,
        rule=reading.choice_at(doc, "rule", "", choices=tuple(RULES), default=SIMPLE),
    )


def _grade(doc: Mapping[str, Any], kind: str) -> str | None:
    if kind.startswith("piston"):
        return None
    return reading.choice_at(doc, "class", "", choices=("A", "AS", "B"))


def _evaporation(doc: Mapping[str, Any]) -> tuple[float, float]:
    """Return g/min and the minutes that a weighing takes where it does not say so itself."""
    if doc.get("evaporation") in (None, ""):
        return 0.0, 0.0
    stated = reading.known_keys(doc["evaporation"], "evaporation", ("rate", "minutes"))
    rate = number_at(stated, "rate", "evaporation", example="0.0008", low="0", high="1")
    minutes = optional_number(stated, "minutes", "evaporation", example="1.0", low="0", high="1440")
    return float(rate), float(minutes or 0)


def _errors(
    doc: Mapping[str, Any], balance: Mapping[str, Any], *, evaporates: bool
) -> tuple[tuple[Input, ...], tuple[str, ...]]:
    """Return the budget's common errors, and the keys that nobody stated."""
    stated = reading.known_keys(doc.get("uncertainty") or {}, "uncertainty", _BOUNDS)
    bounds = {key: bound_at(stated, key, "uncertainty", unit=unit) for key, unit in _BOUNDS.items()}
    weighing = bounds["weighing"] or bound_at(balance, "linearity", "balance", unit="g")
    found = {
        **{key: error_input(key, bound) for key, bound in bounds.items()},
        # a net mass is the difference of two indications (QUAM:2012, A2)
        "weighing": error_input("weighing", weighing, times=math.sqrt(2.0)),
        "balance_errors": error_input(
            "balance_errors", bound_at(balance, "error_u", "balance", unit="g")
        ),
    }
    needed = ["weighing", "water_temperature", "air_temperature", "air_pressure", "air_humidity"]
    if evaporates:
        needed.append("evaporation")
    unstated = tuple(key for key in needed if found[key] is None)
    return tuple(one for one in found.values() if one is not None), unstated


@dataclass(frozen=True, slots=True)
class _Frame:
    """What a weighing falls back on."""

    air: Any
    minutes: float
    has_points: bool
    balance: Mapping[str, Any]
    nominal: Decimal

    def weighing(self, row: Any, index: int) -> TypedWeighing:
        path = f"weighings[{index}]"
        doc = reading.known_keys(row, path, _WEIGHING_KEYS)
        minutes = optional_number(doc, "minutes", path, example="1.0", low="0", high="1440")
        weighed = WaterWeighing(
            net_g=self._net(doc, path),
            water_C=float(number_at(doc, "water", path, example="21.4", low="0", high="40")),
            air=self._air(doc, path),
            minutes=self.minutes if minutes is None else float(minutes),
        )
        left_out = doc.get("left_out") or ""
        if left_out:
            left_out = reading.text_at(doc, "left_out", path, example="drop hung at the tip")
        return TypedWeighing(index, weighed, self._point(doc, path), left_out)

    def _net(self, doc: Mapping[str, Any], path: str) -> float:
        pair = [key for key in ("before", "after") if doc.get(key) not in (None, "")]
        table = read_table(self.balance, "error_table")
        if doc.get("net") not in (None, ""):
            if pair:
                says = f"{path} has a net mass and {pair[0]}; keep one of them."
                raise Unacceptable(says, field=f"{path}.net")
            net = number_at(doc, "net", path, example="9.9712", low="0", high="100000")
            if table:
                says = f"{path}: the balance has an error table, which needs both readings."
                raise Unacceptable(says, field=f"{path}.before", example="23.1123")
            if net == 0:
                raise Unacceptable(f"{path}.net is zero: nothing was weighed.", field=f"{path}.net")
            return float(net)
        before = number_at(doc, "before", path, example="23.1123", low="0", high="100000")
        after = number_at(doc, "after", path, example="33.0835", low="0", high="100000")
        if after <= before:
            says = f"{path}: {after} g is not more than before, {before} g: nothing was delivered."
            raise Unacceptable(says, field=f"{path}.after")
        if not table:
            return float(after - before)
        return corrected(table, after, f"{path}.after") - corrected(table, before, f"{path}.before")

    def _air(self, doc: Mapping[str, Any], path: str) -> Air:
        """Return the air at a weighing; what it does not state itself is that of the run."""
        of_run = reading.known_keys(self.air or {}, "air", tuple(_AIR))
        own = reading.known_keys(doc.get("air") or {}, f"{path}.air", tuple(_AIR))
        values = {}
        for key, (example, low, high) in _AIR.items():
            stated, where = (own, f"{path}.air") if own.get(key) else (of_run, "air")
            values[key] = float(number_at(stated, key, where, example=example, low=low, high=high))
        return Air(**values)

    def _point(self, doc: Mapping[str, Any], path: str) -> Decimal | None:
        if not self.has_points:
            if doc.get("point") not in (None, ""):
                says = f"{path}.point: only a burette is weighed at several readings."
                raise Unacceptable(says, field=f"{path}.point")
            return None
        point = number_at(doc, "point", path, example="10.00", low="0")
        if not 0 < point <= self.nominal:
            says = f"{path}.point: {point} mL must be above zero and within {self.nominal} mL."
            raise Unacceptable(says, field=f"{path}.point", example=str(self.nominal))
        return point
