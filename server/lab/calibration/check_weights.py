"""Daily check-weighings: a reading against the chart's limits, and the chart as a whole."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from decimal import Decimal
from typing import Any

from server.lab import reading_documents as reading
from server.lab.calibration.check import Check
from server.lab.calibration.typed_numbers import list_at, number_at, optional_number, read_number
from server.lab.refusal import Unacceptable
from server.metrology.conformity import Verdict
from server.metrology.decimal_text import decimals_of
from server.metrology.weighing_calibration import ChartLimits, chart_limits

_BASIS = "Shewhart: warning at 2 s, action at 3 s"
_STATED = "limits set by the laboratory"
_TWICE = "two of three beyond warning (Nordtest TR 569, from memory)"


@dataclass(frozen=True, slots=True)
class CheckWeight:
    """A check weight's chart: its name, its limits as decimals in g, and what they rest on."""

    name: str
    centre: Decimal
    warning: Decimal
    action: Decimal
    basis: str


def read_check_weight(document: Any) -> CheckWeight:
    """Return a chart from its document; every number is text in g.

    Keys: ``name``, ``step`` (d), and either ``first`` (at least 5 readings, of which the limits
    are made), or ``centre``, ``warning`` and ``action``.

    Raises:
        Unacceptable: an unknown key, a missing value, limits that do not rise.
    """
    keys = ("name", "step", "first", "centre", "warning", "action")
    doc = reading.known_keys(document, "", keys)
    name = reading.text_at(doc, "name", "", example="100 g, W-3", most=120)
    if doc.get("first") not in (None, "", []):
        return _of_limits(name, _from_first(doc))
    centre = number_at(doc, "centre", "", example="100.0000", low="0")
    warning = number_at(doc, "warning", "", example="0.0003", low="0")
    action = number_at(doc, "action", "", example="0.0005", low="0")
    if not 0 < warning <= action:
        says = "action must not be less than warning, and both above zero."
        raise Unacceptable(says, field="action", example="0.0005")
    return CheckWeight(name, centre, warning, action, _STATED)


def judge_check(weight: CheckWeight, text: str, before: Sequence[str] = ()) -> Check:
    """Return one reading's outcome; ``before`` are the readings so far, oldest first, as typed.

    Within warning it *holds*; between warning and action it is *looked at*; beyond action, or as
    the second of the last three beyond warning on one side, it *fails*.

    Raises:
        Unacceptable: the reading is no number.
    """
    value = read_number(text, "reading", example=str(weight.centre), low="0")
    off = value - weight.centre
    earlier = [read_number(one, "before", example="100.0001") - weight.centre for one in before]
    verdict, words = place_of(
        off, earlier, warning=weight.warning, action=weight.action,
        stop="do not weigh with this balance", look="clean, adjust, weigh it again",
    )  # fmt: skip
    twice = verdict == "fails" and abs(off) <= weight.action
    digits = decimals_of(text) + 1
    apart, centre = _shown(off, digits), _shown(weight.centre, digits)
    return Check(
        name="check weight",
        verdict=verdict,
        says=f"{weight.name}: {text.strip()} g is {apart:+f} g from {centre} g, {words}.",
        basis=f"{weight.basis}; {_TWICE}" if twice else weight.basis,
        figure=float(off),
        limit=float(weight.action),
        unit="g",
        figure_text=f"{apart:+f} g",
        limit_text=(
            f"warning ± {_shown(weight.warning, digits)} g, "
            f"action ± {_shown(weight.action, digits)} g"
        ),
    )


def place_of(
    off: Decimal,
    before: Sequence[Decimal],
    *,
    warning: Decimal,
    action: Decimal,
    stop: str,
    look: str,
) -> tuple[Verdict, str]:
    """Return the verdict on a deviation and where it lies in words; ``before`` oldest first.

    Within warning it *holds*; between warning and action it is *looked at*; beyond action, or as
    the second of the last three beyond warning on one side, it *fails*.
    """
    side = [one for one in before[-2:] if one * off > 0 and abs(one) > warning]
    if abs(off) > action:
        return "fails", f"beyond the action limit: {stop}"
    if abs(off) > warning and side:
        return "fails", f"beyond the warning limit on one side twice within three: {stop}"
    if abs(off) > warning:
        return "look", f"beyond the warning limit: {look}"
    return "holds", "within the warning limit"


def judge_history(weight: CheckWeight, readings: Sequence[str]) -> tuple[Check, ...]:
    """Return the outcome of every reading of a chart, oldest first, each with those before it."""
    return tuple(
        judge_check(weight, one, readings[max(0, i - 2) : i]) for i, one in enumerate(readings)
    )


def _shown(value: Decimal, digits: int) -> Decimal:
    """Return a value to so many decimals; one that has fewer keeps its own."""
    places = -int(value.as_tuple().exponent)
    return value if places <= digits else value.quantize(Decimal(1).scaleb(-digits))


def _from_first(doc: Mapping[str, Any]) -> ChartLimits:
    step = optional_number(doc, "step", "", example="0.0001", low="0")
    if not step:
        says = "step is missing: a limit is never less than one step of the scale."
        raise Unacceptable(says, field="step", example="0.0001")
    rows = list_at(doc, "first", "", least=5, most=200, what="readings")
    values = [
        float(read_number(one, f"first[{i}]", example="100.0001", low="0"))
        for i, one in enumerate(rows)
    ]
    return chart_limits(values, step_g=float(step))


def _of_limits(name: str, limits: ChartLimits) -> CheckWeight:
    def exact(value: float) -> Decimal:
        # to a nanogram: a sum of readings carries the binary fraction's last bits
        return Decimal(f"{value:.9f}").normalize()

    return CheckWeight(
        name, exact(limits.centre_g), exact(limits.warning_g), exact(limits.action_g),
        f"{_BASIS}; {limits.basis}",
    )  # fmt: skip
