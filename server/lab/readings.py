"""The rules of one typed reading: its digits, its unit, its span, its neighbours."""

from collections.abc import Mapping
from dataclasses import dataclass
from decimal import Decimal

from server.lab.curve_entry import METHOD_SLOT
from server.lab.ink import COUNTS_AGAIN, Place
from server.lab.refusal import Unacceptable
from server.lab.rig import Rig
from server.lab.slots import Row
from server.metrology.decimal_text import DecimalProblem, decimals_of, read_typed_decimal

MOST_TEXT = 2000
_UNIT_WORDS = {"Cel": "°C"}


@dataclass(frozen=True, slots=True)
class Beside:
    """What stands around a reading: the other values of the sheet, the rig, a reason given."""

    values: Mapping[Place, str]
    rig: Rig
    reason: str | None = None

    def number(self, place: Place) -> Decimal | None:
        """Return another row's number, or None where nothing is written there."""
        text = self.values.get(place)
        return None if text is None else Decimal(text.replace(",", "."))


def check_reading(row: Row, text: str, unit: str | None, beside: Beside) -> None:
    """Refuse a reading that cannot be.

    Raises:
        Unacceptable: the field is the row's label; the sentence says what is wrong.
    """
    if unit is not None and unit != row.unit:
        says = f"{row.label} is written in {row.unit or 'words'}, not in {unit}."
        raise Unacceptable(says, field=row.label, example=row.unit)
    if row.kind == "number":
        _check_number(row, text, beside)
    elif row.kind == "choice":
        _check_choice(row, text, beside)
    elif not text.strip() or len(text) > MOST_TEXT:
        says = f"{row.label} takes 1 to {MOST_TEXT} characters."
        raise Unacceptable(says, field=row.label)


def _check_choice(row: Row, text: str, beside: Beside) -> None:
    if text not in row.choices:
        says = f"{row.label} cannot be “{text[:60]}”; pick one of {', '.join(row.choices)}."
        raise Unacceptable(says, field=row.label, example=row.choices[0])
    if row.slot == "excluded" and not (beside.reason or "").strip():
        says = (
            "Give the reason why this replicate counts again."
            if text == COUNTS_AGAIN
            else "Give the reason besides the criterion; the replicate stays visible with both."
        )
        raise Unacceptable(says, field="reason", example="drop hung at the tip")
    if row.slot == METHOD_SLOT and not (beside.reason or "").strip():
        says = "Give the reason why another method than the recipe's is taken."
        raise Unacceptable(says, field="reason", example="carbonate bends the fit before the step")


def _check_number(row: Row, text: str, beside: Beside) -> None:
    try:
        value = read_typed_decimal(text, row.label)
    except DecimalProblem as problem:
        raise Unacceptable(problem.says, field=row.label, example=_example(row)) from problem
    if value < 0 and not row.signed:
        raise Unacceptable(f"{row.label} cannot be negative.", field=row.label)
    _check_digits(row, text)
    _check_span(row, text, value, beside)
    if row.slot in {"container_and_standard", "container_less_standard"}:
        _check_mass(row, text, value, beside)
    elif row.slot in {"mass", "tare_load"}:
        _check_load(row, value, beside)
    elif row.slot in {"burette_start", "burette_end"}:
        _check_filling(row, text, value, beside)


def _check_digits(row: Row, text: str) -> None:
    if row.decimals is None:
        return
    typed = decimals_of(text)
    wanted = "no decimal" if row.decimals == 0 else f"{row.decimals} decimals"
    if typed < row.decimals:
        says = f"{row.label}: type all digits shown, including final zeros; {wanted} are read here."
        raise Unacceptable(says, field=row.label, example=_example(row))
    if typed > row.decimals:
        says = f"{row.label}: {text} has more decimals than the instrument shows; it has {wanted}."
        raise Unacceptable(says, field=row.label, example=_example(row))


def _check_span(row: Row, text: str, value: Decimal, beside: Beside) -> None:
    unit = _unit(row)
    if row.low is not None and value < Decimal(row.low):
        says = f"{text} {unit} is below {row.low} {unit}, where {_end_of(row, beside)}."
        raise Unacceptable(says, field=row.label, example=_example(row))
    if row.high is not None and value > Decimal(row.high):
        says = f"{text} {unit} is above {row.high} {unit}, where {_end_of(row, beside)}."
        raise Unacceptable(says, field=row.label, example=_example(row))
    unusual = (row.usual_low is not None and value < Decimal(row.usual_low)) or (
        row.usual_high is not None and value > Decimal(row.usual_high)
    )
    if unusual and not (beside.reason or "").strip():
        says = (
            f"{row.label}: {text} {unit} is unusual ({row.usual_low} to {row.usual_high} {unit} "
            "is expected). Type it again, or give a reason."
        )
        raise Unacceptable(says, field=row.label, example=row.usual_low)


def _end_of(row: Row, beside: Beside) -> str:
    mass = row.slot in {"container_and_standard", "container_less_standard", "mass", "tare_load"}
    table = beside.rig.balance_table if mass else None
    if row.slot.startswith("burette"):
        table = beside.rig.burette_table
    if row.slot == "temperature":
        table = beside.rig.thermometer_table
    if table is not None:
        return "the error table of the calibration ends"
    return "the scale ends"


def _check_mass(row: Row, text: str, value: Decimal, beside: Beside) -> None:
    first = row.slot == "container_and_standard"
    other_slot = "container_less_standard" if first else "container_and_standard"
    other = beside.number((row.replicate, other_slot, 1))
    if other is None:
        return
    if (value <= other) if first else (value >= other):
        relation = "not more than the container after" if first else "not less than before"
        says = f"{text} g is {relation}, {other} g: the mass of the standard would not be positive."
        raise Unacceptable(says, field=row.label)


def _check_load(row: Row, value: Decimal, beside: Beside) -> None:
    if value == 0 and row.slot == "mass":
        raise Unacceptable(f"{row.label} cannot be zero.", field=row.label)
    other = beside.number((row.replicate, "tare_load" if row.slot == "mass" else "mass", 1))
    if other is not None and row.high is not None and other + value > Decimal(row.high):
        says = f"Load and standard together are above {row.high} g, where {_end_of(row, beside)}."
        raise Unacceptable(says, field=row.label)


def _check_filling(row: Row, text: str, value: Decimal, beside: Beside) -> None:
    if row.segment > 1:
        before = (row.replicate, "burette_end", row.segment - 1)
        if before not in beside.values:
            says = f"Write the end of filling {row.segment - 1} first."
            raise Unacceptable(says, field=row.label)
    start_here = row.slot == "burette_start"
    other_slot = "burette_end" if start_here else "burette_start"
    other = beside.number((row.replicate, other_slot, row.segment))
    if other is None:
        return
    if (value > other) if start_here else (value < other):
        says = (
            f"{text} mL is more than the end, {other} mL. Type it again."
            if start_here
            else f"{text} mL is less than the start, {other} mL. "
            "Refilled? Add a segment, or type it again."
        )
        raise Unacceptable(says, field=row.label)


def _unit(row: Row) -> str:
    return _UNIT_WORDS.get(row.unit or "", row.unit or "")


def _example(row: Row) -> str | None:
    if row.decimals is None:
        return None
    return "18." + "6".ljust(row.decimals, "0")[: row.decimals] if row.decimals else "18"
