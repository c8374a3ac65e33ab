"""A thermometer beside a reference: corrections with their uncertainty."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from decimal import Decimal
from itertools import pairwise
from typing import Any

from server.lab import reading_documents as reading
from server.lab.calibration.check import Check, conformity_check, overall
from server.lab.calibration.typed_numbers import (
    as_text,
    bound_at,
    corrected,
    list_at,
    number_at,
    optional_number,
    statement_of,
)
from server.lab.refusal import Unacceptable
from server.metrology.conformity import RULES, SIMPLE, Verdict, judge
from server.metrology.error_curve import bend_between
from server.metrology.propagation import Input, propagate
from server.metrology.rounding import significant

_KEYS = ("step", "points", "reference_u", "limits", "rule")


@dataclass(frozen=True, slots=True)
class ThermometerOutcome:
    """A thermometer's table and statement.

    ``error_table`` holds readings in °C and what is added to them, as text; ``document`` states
    what one reading is uncertain by once it is corrected, ``uncorrected`` what it is without.
    """

    error_table: tuple[tuple[str, str], ...]
    u_C: float
    checks: tuple[Check, ...]
    document: dict[str, Any]
    uncorrected: dict[str, Any]

    @property
    def verdict(self) -> Verdict:
        """The gravest of the checks."""
        return overall(self.checks)


def judge_thermometer(document: Any) -> ThermometerOutcome:
    """Return a thermometer's corrections from its document; every number is text in °C.

    Keys: ``step`` (of the scale), ``points`` [{reading, reference}] rising, ``reference_u`` (bound,
    Cel), ``limits`` {error}?, ``rule``. u² = u(reference)² + step²/12 + bend²/3.

    Raises:
        Unacceptable: an unknown key, a missing value, readings that do not rise.
    """
    doc = reading.known_keys(document, "", _KEYS)
    step = number_at(doc, "step", "", example="0.1", low="0.0001", high="10")
    of_reference = bound_at(doc, "reference_u", "", unit="Cel")
    if of_reference is None:
        says = "reference_u is missing: what the reference thermometer is uncertain by."
        example = '{"unit": "Cel", "U": "0.05", "k": "2"}'
        raise Unacceptable(says, field="reference_u", example=example)
    points = _points(doc)
    table = [(float(at), float(added)) for at, added in points]
    bend = bend_between(table)
    inputs = [
        Input(name="reference", value=0.0, u=of_reference.u),
        Input(name="step", value=0.0, u=float(step) / 12.0**0.5),
        Input(name="bend", value=0.0, u=bend / 3.0**0.5),
    ]
    u = propagate(lambda x: sum(x.values()), inputs).u
    largest = max(abs(added) for _, added in table)
    return ThermometerOutcome(
        error_table=tuple((str(at), str(added)) for at, added in points),
        u_C=u,
        checks=(_check(doc, table, u),),
        document={"reading": statement_of("Cel", u, None, "calibration, corrected by its table")},
        uncorrected={
            "reading": {
                "unit": "Cel",
                "half_width": as_text(largest + 2.0 * u),
                "shape": "rectangular",
                "source": "calibration, largest correction and its U: not corrected",
            }
        },
    )


def corrected_temperature(table: Sequence[tuple[str, str]], typed: Decimal) -> float:
    """Return a reading in °C with its correction, linear between the table's points.

    Raises:
        Unacceptable: the reading lies outside the table.
    """
    rows = [(float(at), float(added)) for at, added in table]
    return corrected(rows, typed, "temperature")


def _points(doc: Mapping[str, Any]) -> list[tuple[Decimal, Decimal]]:
    rows = list_at(doc, "points", "", least=2, most=60, what="points")
    found = []
    for i, row in enumerate(rows):
        path = f"points[{i}]"
        point = reading.known_keys(row, path, ("reading", "reference"))
        at = number_at(point, "reading", path, example="20.1", low="-50", high="200")
        true = number_at(point, "reference", path, example="20.03", low="-50", high="200")
        found.append((at, true - at))
    for i, (one, next_one) in enumerate(pairwise(found), start=1):
        if one[0] >= next_one[0]:
            says = f"points[{i}]: the readings must rise from row to row."
            raise Unacceptable(says, field=f"points[{i}].reading")
    return found


def _check(doc: Mapping[str, Any], table: Sequence[tuple[float, float]], u: float) -> Check:
    limits = reading.known_keys(doc.get("limits") or {}, "limits", ("error",))
    limit = optional_number(limits, "error", "limits", example="0.5", low="0")
    at, added = max(table, key=lambda row: abs(row[1]))
    says = f"The largest error is {-added:+.3f} °C at {at:g} °C, with U = {significant(2 * u)} °C"
    if limit is None:
        basis = "figure only: no limit is set"
        return Check("error", "holds", f"{says}.", basis, figure=-added, unit="Cel")
    rule = reading.choice_at(doc, "rule", "", choices=tuple(RULES), default=SIMPLE)
    return conformity_check(
        "error", judge(added, float(limit), rule=rule, U=2.0 * u), unit="Cel",
        basis="limit set by the laboratory", says=f"{says}; permitted are ± {limit} °C.",
        shown=(f"{-added:+.3f} °C", f"± {limit} °C"),
    )  # fmt: skip
