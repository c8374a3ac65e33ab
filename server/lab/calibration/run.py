"""A calibration done here, reading by reading: one door for every kind of instrument."""

from collections.abc import Mapping, Sequence
from copy import deepcopy
from dataclasses import dataclass
from typing import Any

from server.lab import reading_documents as reading
from server.lab.calibration.balance import judge_balance
from server.lab.calibration.check import Check, overall
from server.lab.calibration.probe import judge_probe
from server.lab.calibration.thermometer import judge_thermometer
from server.lab.calibration.told import (
    Told,
    told_balance,
    told_probe,
    told_thermometer,
    told_water,
)
from server.lab.calibration.ware_verdict import judge_ware
from server.lab.calibration.water_run import read_water_run
from server.lab.papers import read_calibration
from server.lab.refusal import Unacceptable
from server.lab.sheet_facts import (
    BALANCE,
    BURETTE,
    FLASK,
    PIPETTE,
    PROBE,
    ROOM,
    THERMOMETER,
    InstrumentFact,
)
from server.metrology.conformity import Verdict
from server.metrology.decimal_text import DecimalProblem, read_wire_decimal
from server.metrology.glassware import interpolate_error
from server.metrology.tolerances import PISTON_BURETTE, PISTON_PIPETTE

#: What each kind of instrument is weighed as.
WARE_OF_KIND: Mapping[str, tuple[str, ...]] = {
    BURETTE: ("burette", PISTON_BURETTE),
    PIPETTE: ("pipette", PISTON_PIPETTE),
    FLASK: ("flask",),
}
#: The kinds that are calibrated here; a room monitor is calibrated elsewhere.
KINDS = (*WARE_OF_KIND, BALANCE, PROBE, THERMOMETER)
#: How a thermometer's corrections serve: by its table, or as one bound without correction.
BY_TABLE, AS_BOUND = "table", "bound"
_ROOM_BOUNDS = {
    "air_temperature": "temperature", "air_pressure": "pressure", "air_humidity": "humidity",
}  # fmt: skip


@dataclass(frozen=True, slots=True)
class UsedInstrument:
    """An instrument that a run was done with, and the calibration of it that served."""

    kind: str
    instrument_id: str
    calibration_id: str
    name: str
    version: int
    certificate_number: str
    document: Mapping[str, Any]

    def to_document(self) -> dict[str, Any]:
        """Return it as a run keeps it."""
        return {
            "kind": self.kind,
            "instrument_id": self.instrument_id,
            "calibration_id": self.calibration_id,
            "name": self.name,
            "version": self.version,
            "certificate_number": self.certificate_number,
            "document": dict(self.document),
        }


@dataclass(frozen=True, slots=True)
class JudgedRun:
    """A run's outcome: what the calibration states for use, its checks, and how it is shown."""

    document: dict[str, Any]
    checks: tuple[Check, ...]
    told: Told

    @property
    def verdict(self) -> Verdict:
        """The gravest of the checks."""
        return overall(self.checks)


def used_instrument(fact: InstrumentFact) -> UsedInstrument:
    """Return an instrument with the calibration that serves it now."""
    return UsedInstrument(
        kind=fact.kind,
        instrument_id=fact.instrument_id,
        calibration_id=fact.calibration_id,
        name=fact.name,
        version=fact.version,
        certificate_number=fact.certificate_number,
        document=fact.document,
    )


def judge_run(
    kind: str, document: Mapping[str, Any], used: Sequence[UsedInstrument] = ()
) -> JudgedRun:
    """Return the outcome of a run from its document as typed.

    ``used`` are the balance, thermometer and room monitor of a gravimetric run: their corrections
    and uncertainties count, where the document states none itself.

    Raises:
        Unacceptable: a kind that is not calibrated here, or a value that cannot be taken.
    """
    if not isinstance(document, Mapping):
        raise Unacceptable("run must be an object.", field="run")
    if kind in WARE_OF_KIND:
        judged = _judge_ware(kind, document, used)
    elif kind == BALANCE:
        judged = _judge_balance(document)
    elif kind == PROBE:
        probe = judge_probe(document)
        judged = JudgedRun(probe.document, probe.checks, told_probe(document, probe))
    elif kind == THERMOMETER:
        judged = _judge_thermometer(document)
    else:
        says = f"A {kind} is calibrated elsewhere: record its certificate."
        raise Unacceptable(says, field="kind", example=BURETTE)
    return JudgedRun(read_calibration(kind, judged.document), judged.checks, judged.told)


def with_instruments(document: Mapping[str, Any], used: Sequence[UsedInstrument]) -> dict[str, Any]:
    """Return a gravimetric run's document with what its instruments' calibrations state.

    The balance's corrections and bounds, the thermometer's and the room monitor's uncertainties;
    readings of a thermometer that has a table of corrections are corrected by it.
    """
    filled: dict[str, Any] = deepcopy(dict(document))
    by_kind = {one.kind: one.document for one in used}
    stated = filled.get("uncertainty") or {}
    if not isinstance(stated, Mapping):
        return filled  # refused by its name when it is read
    bounds = dict(stated)
    balance = by_kind.get(BALANCE)
    if balance is not None and not filled.get("balance"):
        keys = ("linearity", "error_table", "error_u")
        filled["balance"] = {key: balance[key] for key in keys if balance.get(key)}
    thermometer = by_kind.get(THERMOMETER)
    if thermometer is not None:
        bounds.setdefault("water_temperature", thermometer["reading"])
        _correct_water(filled, thermometer.get("error_table") or ())
    room = by_kind.get(ROOM)
    if room is not None:
        for key, stated in _ROOM_BOUNDS.items():
            bounds.setdefault(key, room[stated])
    if bounds:
        filled["uncertainty"] = {key: _bare(bound) for key, bound in bounds.items()}
    return filled


def _bare(bound: Any) -> Any:
    """Return a bound without the root that a calibration may name."""
    if not isinstance(bound, Mapping):
        return bound
    return {key: value for key, value in bound.items() if key != "id"}


def _correct_water(filled: dict[str, Any], table: Sequence[Sequence[str]]) -> None:
    rows = [(float(at), float(added)) for at, added in table]
    if not rows or not isinstance(filled.get("weighings"), list | tuple):
        return
    filled["weighings"] = [
        _with_water(one, i, rows) if isinstance(one, Mapping) and one.get("water") else one
        for i, one in enumerate(filled["weighings"])
    ]


def _with_water(
    weighing: Mapping[str, Any], index: int, rows: Sequence[tuple[float, float]]
) -> dict[str, Any]:
    where = f"weighings[{index}].water"
    text = str(weighing["water"]).strip()
    try:
        reading_C = float(read_wire_decimal(text, where))
        added = interpolate_error(rows, reading_C)
    except DecimalProblem as problem:
        raise Unacceptable(problem.says, field=where, example="21.4") from problem
    except ValueError as problem:
        says = f"{where}: {problem}; the thermometer's calibration reaches no further."
        raise Unacceptable(says, field=where) from problem
    return {**weighing, "water": f"{reading_C + added:.6f}"}


def _judge_ware(
    kind: str, document: Mapping[str, Any], used: Sequence[UsedInstrument]
) -> JudgedRun:
    wares = WARE_OF_KIND[kind]
    ware = document.get("kind", wares[0])
    if ware not in wares:
        says = f"kind cannot be “{str(ware)[:40]}”: this is a {kind}; it is {' or '.join(wares)}."
        raise Unacceptable(says, field="kind", example=wares[0])
    run = read_water_run(with_instruments({**document, "kind": ware}, used))
    outcome = judge_ware(run)
    return JudgedRun(outcome.document, outcome.checks, told_water(document, run, outcome))


def _judge_balance(document: Mapping[str, Any]) -> JudgedRun:
    outcome = judge_balance(document)
    stated = {**outcome.document, "minimum_g": outcome.minimum_g}
    return JudgedRun(stated, outcome.checks, told_balance(document, outcome))


def _judge_thermometer(document: Mapping[str, Any]) -> JudgedRun:
    serves = reading.choice_at(
        document, "serves", "", choices=(BY_TABLE, AS_BOUND), default=BY_TABLE
    )
    typed = {key: value for key, value in document.items() if key != "serves"}
    outcome = judge_thermometer(typed)
    stated = dict(outcome.uncorrected)
    if serves == BY_TABLE:
        table = [list(row) for row in outcome.error_table]
        stated = {**outcome.document, "error_table": table}
    return JudgedRun(stated, outcome.checks, told_thermometer(typed, outcome))
