"""A probe in buffers: slope, offset and verdict, from the readings as typed."""

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from server.chemistry.buffers import BufferPH, NoBuffer, buffer_pH
from server.chemistry.electrode import BufferReading, ProbeFit, fit_probe, nernst_slope_mV
from server.lab import reading_documents as reading
from server.lab.calibration.check import Check, overall
from server.lab.calibration.typed_numbers import (
    bound_at,
    list_at,
    number_at,
    optional_number,
)
from server.lab.refusal import Unacceptable
from server.metrology.conformity import SIMPLE, Verdict, judge

#: Slope in percent of Nernst and offset in mV that a probe may have: common practice.
SLOPE_PERCENT, OFFSET_MV = (95.0, 102.0), 30.0
_BASIS_SLOPE = "common practice: probe slope 95 to 102 % of the Nernst slope"
_BASIS_OFFSET = "common practice: probe offset at most 30 mV"
_KEYS = ("set", "buffers", "uncertainty", "limits")
_BUFFER_KEYS = ("buffer", "temperature", "mV", "pH", "certified_pH", "u_pH")


@dataclass(frozen=True, slots=True)
class BufferRow:
    """One buffer as it is shown: its pH there and whence, the Nernst slope, the residual in mV."""

    buffer: str
    temperature_C: float
    pH: float
    u_pH: float
    source: str
    nernst_mV: float
    residual_mV: float


@dataclass(frozen=True, slots=True)
class ProbeOutcome:
    """A probe's slope and offset with their checks.

    ``document`` states ``slope_percent`` and ``offset_mV`` as a finding of a standardization takes
    them, each with its u.
    """

    fit: ProbeFit
    rows: tuple[BufferRow, ...]
    checks: tuple[Check, ...]
    document: dict[str, Any]

    @property
    def verdict(self) -> Verdict:
        """The gravest of the checks."""
        return overall(self.checks)


def judge_probe(document: Any) -> ProbeOutcome:
    """Return a probe's outcome from its document; every number is text as typed.

    Keys: ``set`` (name of the buffers' table), ``buffers`` [{buffer, temperature °C, mV or pH as
    the meter shows it by theory; certified_pH and u_pH? from the buffer's own certificate}],
    ``uncertainty`` {reading mV, temperature Cel}?, ``limits`` {slope_least, slope_most, offset}?.

    Raises:
        Unacceptable: an unknown key, buffer or temperature, fewer than two buffers.
    """
    doc = reading.known_keys(document, "", _KEYS)
    set_name = reading.text_at(doc, "set", "", example="JIS Z 8802:2011", most=60)
    rows = list_at(doc, "buffers", "", least=2, most=12, what="buffers")
    read = [_buffer(row, f"buffers[{i}]", set_name) for i, row in enumerate(rows)]
    stated = reading.known_keys(
        doc.get("uncertainty") or {}, "uncertainty", ("reading", "temperature")
    )
    of_reading = bound_at(stated, "reading", "uncertainty", unit="mV")
    of_temperature = bound_at(stated, "temperature", "uncertainty", unit="Cel")
    try:
        fit = fit_probe(
            [one for _, one, _ in read],
            u_mV=of_reading.u if of_reading else 0.0,
            u_temperature_C=of_temperature.u if of_temperature else 0.0,
        )
    except ValueError as problem:
        raise Unacceptable(str(problem), field="buffers") from problem
    return ProbeOutcome(
        fit=fit,
        rows=tuple(
            BufferRow(
                name, one.temperature_C, one.pH, one.u_pH, source,
                nernst_slope_mV(one.temperature_C), residual,
            )
            for (name, one, source), residual in zip(read, fit.residuals_mV, strict=True)
        ),
        checks=_checks(fit, _limits(doc)),
        document={
            "slope_percent": f"{fit.slope_percent:.3f}",
            "u_slope_percent": f"{fit.u_slope_percent:.3f}",
            "offset_mV": f"{fit.offset_mV:.3f}",
            "u_offset_mV": f"{fit.u_offset_mV:.3f}",
        },
    )  # fmt: skip


def _buffer(row: Any, path: str, set_name: str) -> tuple[str, BufferReading, str]:
    doc = reading.known_keys(row, path, _BUFFER_KEYS)
    name = reading.text_at(doc, "buffer", path, example="phthalate", most=60)
    t = float(number_at(doc, "temperature", path, example="24.6", low="0", high="95"))
    shown = [key for key in ("mV", "pH") if doc.get(key) not in (None, "")]
    if len(shown) != 1:
        says = f"{path} needs what the meter shows: mV or pH, one of them."
        raise Unacceptable(says, field=f"{path}.mV", example="176.9")
    mV = optional_number(doc, "mV", path, example="176.9", low="-1000", high="1000")
    pH = optional_number(doc, "pH", path, example="4.02", low="-2", high="16")
    known = _pH_of(doc, path, set_name=set_name, name=name, temperature=t)
    return (
        name,
        BufferReading(
            pH=known.pH,
            u_pH=known.u,
            temperature_C=t,
            mV=None if mV is None else float(mV),
            shown_pH=None if pH is None else float(pH),
        ),
        known.source,
    )


def _pH_of(
    doc: Mapping[str, Any], path: str, *, set_name: str, name: str, temperature: float
) -> BufferPH:
    """Return the buffer's pH by its own certificate where it is stated, else by the table."""
    own = optional_number(doc, "certified_pH", path, example="4.008", low="0", high="14")
    u = optional_number(doc, "u_pH", path, example="0.005", low="0", high="1")
    if own is not None:
        source = "certificate of the buffer"
        return BufferPH(source, name, temperature, float(own), float(u or 0), source, "stated")
    try:
        found = buffer_pH(set_name, name, temperature)
    except NoBuffer as problem:
        field = "set" if problem.about == "set" else f"{path}.{problem.about}"
        raise Unacceptable(problem.says, field=field) from problem
    if u is None:
        return found
    return BufferPH(
        found.set_name, name, temperature, found.pH, float(u), found.source, found.provenance
    )


def _limits(doc: Mapping[str, Any]) -> tuple[float, float, float]:
    keys = ("slope_least", "slope_most", "offset")
    stated = reading.known_keys(doc.get("limits") or {}, "limits", keys)
    defaults = (*SLOPE_PERCENT, OFFSET_MV)
    least, most, offset = (
        float(default if found is None else found)
        for default, found in zip(
            defaults,
            (optional_number(stated, key, "limits", example="95", low="0") for key in keys),
            strict=True,
        )
    )
    if least >= most:
        says = "limits.slope_most must be above slope_least."
        raise Unacceptable(says, field="limits.slope_most", example="102")
    return least, most, offset


def _checks(fit: ProbeFit, limits: tuple[float, float, float]) -> tuple[Check, ...]:
    least, most, offset = limits
    middle, half = 0.5 * (least + most), 0.5 * (most - least)
    slope = judge(fit.slope_percent - middle, half)
    zero = judge(fit.offset_mV, offset)
    set_by = "limit set by the laboratory"
    residual = max((abs(one) for one in fit.residuals_mV), default=0.0)
    agree = f" The buffers agree within {residual:.1f} mV." if fit.dof else ""
    return (
        Check(
            name="probe slope",
            verdict=slope.verdict,
            says=f"The slope is {fit.slope_percent:.1f} % of Nernst (u = "
            f"{fit.u_slope_percent:.1f} %); {least:g} to {most:g} % are taken.{agree}",
            basis=_BASIS_SLOPE if limits[:2] == SLOPE_PERCENT else set_by,
            rule=SIMPLE,
            figure=fit.slope_percent,
            limit=least if fit.slope_percent < middle else most,
            unit="%",
            figure_text=f"{fit.slope_percent:.1f} %",
            limit_text=f"{least:g} to {most:g} %",
        ),
        Check(
            name="probe offset",
            verdict=zero.verdict,
            says=f"At pH 7 the probe is {fit.offset_mV:+.1f} mV off (u = {fit.u_offset_mV:.1f} "
            f"mV); ± {offset:g} mV are taken.",
            basis=_BASIS_OFFSET if offset == OFFSET_MV else set_by,
            rule=SIMPLE,
            figure=fit.offset_mV,
            limit=offset,
            unit="mV",
            figure_text=f"{fit.offset_mV:+.1f} mV",
            limit_text=f"± {offset:g} mV",
        ),
    )
