"""Buffer checks of a probe between two calibrations: what the meter shows in a known buffer."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from decimal import Decimal
from typing import Any

from server.chemistry.buffers import NoBuffer, buffer_pH
from server.lab import reading_documents as reading
from server.lab.calibration.check import Check
from server.lab.calibration.check_weights import place_of
from server.lab.calibration.typed_numbers import number_at
from server.lab.refusal import Unacceptable

#: How far a probe may be off in a buffer before it is looked at, and before it is not used.
WARNING_PH, ACTION_PH = "0.03", "0.05"
_BASIS = "common practice: a check buffer within 0.05 of its pH"
_STATED = "limits set by the laboratory"


@dataclass(frozen=True, slots=True)
class BufferChart:
    """A check buffer: its set and name, and limits in pH around the table's value."""

    set_name: str
    buffer: str
    warning: Decimal
    action: Decimal
    basis: str

    @property
    def name(self) -> str:
        """The buffer as one would name it."""
        return f"{self.buffer}, {self.set_name}"


def read_buffer_chart(document: Any) -> BufferChart:
    """Return a check buffer's chart from its document; every number is text.

    Keys: ``set``, ``buffer``, ``warning`` and ``action`` in pH (0.03 and 0.05 where absent).

    Raises:
        Unacceptable: an unknown key, set or buffer, limits that do not rise.
    """
    doc = reading.known_keys(document, "", ("set", "buffer", "warning", "action"))
    set_name = reading.text_at(doc, "set", "", example="JIS Z 8802:2011", most=60)
    buffer = reading.text_at(doc, "buffer", "", example="phosphate", most=60)
    _pH(set_name, buffer, 25.0)
    limits = {"warning": WARNING_PH, "action": ACTION_PH}
    stated = {**limits, **{key: doc[key] for key in limits if doc.get(key) not in (None, "")}}
    warning = number_at(stated, "warning", "", example=WARNING_PH, low="0")
    action = number_at(stated, "action", "", example=ACTION_PH, low="0")
    if not 0 < warning <= action:
        says = "action must not be less than warning, and both above zero."
        raise Unacceptable(says, field="action", example=ACTION_PH)
    basis = _BASIS if stated == limits else _STATED
    return BufferChart(set_name, buffer, warning, action, basis)


def judge_buffer(
    chart: BufferChart, document: Any, before: Sequence[Mapping[str, Any]] = ()
) -> Check:
    """Return one buffer check's outcome; ``before`` are the checks so far, oldest first.

    Keys of a check: ``chart`` (its line), ``temperature`` °C, ``pH`` as the meter shows it.

    Raises:
        Unacceptable: a missing or impossible value, a temperature that the table does not have.
    """
    off, true, shown, t = _off(chart, document)
    earlier = [_off(chart, one)[0] for one in before]
    verdict, words = place_of(
        off, earlier, warning=chart.warning, action=chart.action,
        stop="calibrate the probe before it is used", look="rinse, wait, read it again",
    )  # fmt: skip
    return Check(
        name="buffer check",
        verdict=verdict,
        says=f"{chart.buffer} at {t} °C: {shown} is {off:+.3f} from {true:.3f} by {chart.set_name},"
        f" {words}.",
        basis=chart.basis,
        figure=float(off),
        limit=float(chart.action),
        unit="pH",
        figure_text=f"{off:+.3f}",
        limit_text=f"warning ± {chart.warning}, action ± {chart.action}",
    )


def _off(chart: BufferChart, document: Any) -> tuple[Decimal, Decimal, Decimal, Decimal]:
    doc = reading.known_keys(document, "", ("chart", "temperature", "pH", "remark"))
    t = number_at(doc, "temperature", "", example="24.6", low="0", high="95")
    shown = number_at(doc, "pH", "", example="6.87", low="-2", high="16")
    true = Decimal(f"{_pH(chart.set_name, chart.buffer, float(t)):.3f}")
    return shown - true, true, shown, t


def _pH(set_name: str, buffer: str, temperature: float) -> float:
    try:
        return buffer_pH(set_name, buffer, temperature).pH
    except NoBuffer as problem:
        raise Unacceptable(problem.says, field=problem.about) from problem
