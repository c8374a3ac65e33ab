"""Calibration of a balance as it was typed: weights up and down, repeatability, eccentricity."""

from collections.abc import Mapping
from dataclasses import dataclass
from decimal import Decimal
from itertools import pairwise
from typing import Any

from server.lab import reading_documents as reading
from server.lab.calibration.balance_checks import balance_checks
from server.lab.calibration.check import Check, overall
from server.lab.calibration.typed_numbers import (
    as_text,
    bound_at,
    list_at,
    number_at,
    optional_number,
    read_number,
    statement_of,
)
from server.lab.refusal import Unacceptable
from server.metrology.air import cipm_2007
from server.metrology.conformity import RULES, SIMPLE, Verdict
from server.metrology.weighing_calibration import (
    WeighingCalibration,
    WeightReading,
    calibrate_balance,
    largest_eccentricity,
    minimum_mass,
)

_KEYS = (
    "step", "weights", "repeatability", "eccentricity", "air", "weights_density", "limits", "rule",
)  # fmt: skip
_LIMITS = ("error", "eccentricity", "hysteresis")
_AIR = {"temperature": ("21.3", "0", "50"), "pressure": ("1003.1", "500", "1100"),
        "humidity": ("46", "0", "100")}  # fmt: skip


@dataclass(frozen=True, slots=True)
class Eccentricity:
    """One load read in the centre and off it, in g as text, with the largest difference."""

    centre: str
    positions: tuple[str, ...]
    largest_g: float


@dataclass(frozen=True, slots=True)
class BalanceOutcome:
    """A balance's calibration: its figures, checks, and what it states for use.

    ``document`` is what `papers.read_calibration` takes; ``minimum_g`` the smallest net mass by
    USP <41> as text, for the instrument's own document.
    """

    found: WeighingCalibration
    eccentricity: Eccentricity | None
    minimum_g: str
    checks: tuple[Check, ...]
    document: dict[str, Any]

    @property
    def verdict(self) -> Verdict:
        """The gravest of the checks."""
        return overall(self.checks)


def judge_balance(document: Any) -> BalanceOutcome:
    """Return a balance's calibration from its document; every number is text as typed.

    Keys: ``step`` (d, in g), ``weights`` [{nominal, conventional g, up g, down g?, and the
    uncertainty of the conventional value: u, or U with k}] rising, ``repeatability`` {load?,
    readings: at least 5}, ``eccentricity`` {centre, positions}?, ``air`` {temperature °C, pressure
    hPa, humidity %}? with ``weights_density`` (quantity, kg/m3)?, ``limits`` {error, eccentricity,
    hysteresis: g}?, ``rule`` (the decision rule).

    Raises:
        Unacceptable: an unknown key, a missing or impossible value, named by its path.
    """
    doc = reading.known_keys(document, "", _KEYS)
    step = number_at(doc, "step", "", example="0.0001", low="0.0000001", high="1000")
    repeated = _readings(doc)
    found = calibrate_balance(
        _weights(doc),
        [float(one) for one in repeated],
        step_g=float(step),
        air_kg_m3=_air(doc),
        weights_density=_density(doc),
    )
    eccentricity = _eccentricity(doc)
    least = minimum_mass(found.s_g, float(step))
    rule = reading.choice_at(doc, "rule", "", choices=tuple(RULES), default=SIMPLE)
    return BalanceOutcome(
        found=found,
        eccentricity=eccentricity,
        minimum_g=as_text(least),
        checks=balance_checks(
            found,
            readings=len(repeated),
            eccentricity_g=eccentricity.largest_g if eccentricity else None,
            minimum_g=least,
            limits=_limits(doc),
            rule=rule,
        ),
        document=_document(found),
    )


def _document(found: WeighingCalibration) -> dict[str, Any]:
    """Return linearity, error table and its u; the table says what is *added* to an indication."""
    loads = len(found.errors)
    source = f"calibration with weights, {loads} load{'s' if loads > 1 else ''}"
    table = [["0", "0"]]
    table += [[as_text(one.indication_g), as_text(one.correction_g)] for one in found.errors]
    linearity = {
        "unit": "g",
        "half_width": as_text(found.linearity_g),
        "shape": "rectangular",
        "source": "step of the scale, hysteresis and bend that the error table leaves",
    }
    return {
        "linearity": linearity,
        "error_table": table,
        "error_u": statement_of("g", found.error_u_g, found.error_u_dof, source),
    }


def _weights(doc: Mapping[str, Any]) -> list[WeightReading]:
    rows = list_at(doc, "weights", "", least=1, most=60, what="weights")
    found = [_weight(row, f"weights[{i}]") for i, row in enumerate(rows)]
    for i, (one, next_one) in enumerate(pairwise(found), start=1):
        if one.indication_g >= next_one.indication_g:
            says = f"weights[{i}]: the loads must rise from one weight to the next."
            raise Unacceptable(says, field=f"weights[{i}].up")
    return found


def _weight(row: Any, path: str) -> WeightReading:
    keys = ("nominal", "conventional", "u", "U", "k", "up", "down", "name")
    doc = reading.known_keys(row, path, keys)
    conventional = number_at(doc, "conventional", path, example="100.00003", low="0")
    nominal = optional_number(doc, "nominal", path, example="100", low="0") or conventional
    up = number_at(doc, "up", path, example="100.0001", low="0")
    down = optional_number(doc, "down", path, example="100.0002", low="0")
    if conventional == 0:
        says = f"{path}.conventional must be above zero: the balance is zeroed without a weight."
        raise Unacceptable(says, field=f"{path}.conventional", example="100.00003")
    for key, value in (("conventional", conventional), ("up", up), ("down", down)):
        if value is not None and abs(value / nominal - 1) > Decimal("0.01"):
            says = f"{path}.{key}: {value} g is more than 1 % from the nominal {nominal} g."
            raise Unacceptable(says, field=f"{path}.{key}", example=str(nominal))
    return WeightReading(
        conventional_g=float(conventional),
        u_g=_weight_u(doc, path),
        up_g=float(up),
        down_g=None if down is None else float(down),
    )


def _weight_u(doc: Mapping[str, Any], path: str) -> float:
    stated = {key: doc[key] for key in ("u", "U", "k") if doc.get(key) not in (None, "")}
    bound = bound_at({"u": {"unit": "g", **stated}}, "u", path, unit="g") if stated else None
    if bound is None:
        says = f"{path}.u is missing: the weight's certificate states U and k."
        raise Unacceptable(says, field=f"{path}.u", example='"U": "0.00015", "k": "2"')
    return bound.u


def _readings(doc: Mapping[str, Any]) -> list[Decimal]:
    stated = reading.known_keys(doc.get("repeatability"), "repeatability", ("load", "readings"))
    optional_number(stated, "load", "repeatability", example="100", low="0")
    rows = list_at(stated, "readings", "repeatability", least=5, most=100, what="readings")
    return [
        read_number(one, f"repeatability.readings[{i}]", example="100.0001", low="0")
        for i, one in enumerate(rows)
    ]


def _eccentricity(doc: Mapping[str, Any]) -> Eccentricity | None:
    if doc.get("eccentricity") in (None, ""):
        return None
    path = "eccentricity"
    stated = reading.known_keys(doc["eccentricity"], path, ("centre", "positions"))
    centre = number_at(stated, "centre", path, example="100.0001", low="0")
    rows = list_at(stated, "positions", path, least=2, most=8, what="positions off the centre")
    positions = [
        read_number(one, f"{path}.positions[{i}]", example="100.0002", low="0")
        for i, one in enumerate(rows)
    ]
    largest = largest_eccentricity(float(centre), [float(one) for one in positions])
    return Eccentricity(str(centre), tuple(str(one) for one in positions), largest)


def _air(doc: Mapping[str, Any]) -> float | None:
    if doc.get("air") in (None, ""):
        return None
    stated = reading.known_keys(doc["air"], "air", tuple(_AIR))
    values = [
        float(number_at(stated, key, "air", example=example, low=low, high=high))
        for key, (example, low, high) in _AIR.items()
    ]
    return float(cipm_2007(*values))


def _density(doc: Mapping[str, Any]) -> tuple[float, float]:
    stated = reading.positive_at(doc, "weights_density", "", unit="kg/m3")
    if stated is None:
        return 8000.0, 0.0
    statement = {key: value for key, value in stated.items() if key != "value"}
    bound = bound_at({"weights_density": statement}, "weights_density", "", unit="kg/m3") if (
        {"u", "U", "half_width"} & stated.keys()
    ) else None  # fmt: skip
    return float(stated["value"]), bound.u if bound else 0.0


def _limits(doc: Mapping[str, Any]) -> dict[str, float]:
    stated = reading.known_keys(doc.get("limits") or {}, "limits", _LIMITS)
    found = {
        key: optional_number(stated, key, "limits", example="0.0005", low="0") for key in _LIMITS
    }
    return {key: float(value) for key, value in found.items() if value is not None}
