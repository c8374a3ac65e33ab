"""The probe as a curve's fit has it, beside its last calibration in buffers."""

from collections.abc import Mapping
from typing import Any

from server.chemistry.electrode import nernst_slope_mV
from server.curves.analysis import Analysis
from server.lab.sheet_facts import InstrumentFact
from server.sheets.curves import ProbeBeside, ProbeLine
from server.sheets.parts.telling import typed_day_words

_ADJUSTED = (
    "A meter that was set with these buffers has them in its readings already: then 100 % and "
    "0 mV are to be expected from the curve."
)
_NO_PROBE = "No probe was named for this sheet, so there is no calibration to compare with."


def probe_beside(analysis: Analysis, probe: InstrumentFact | None) -> ProbeBeside | None:
    """Return slope (percent of Nernst) and offset (mV at pH 7) of a fit beside the buffers'.

    None where there is no fit.
    """
    if analysis.fitted is None:
        return None
    fit = analysis.fitted.fit
    nernst = float(nernst_slope_mV(fit.balance.flask.temperature_C))
    slope, offset = 100 * fit.value("slope"), -nernst * fit.value("offset")
    u_slope, u_offset = 100 * fit.u("slope"), nernst * fit.u("offset")
    document: Mapping[str, Any] = probe.document if probe is not None else {}
    return ProbeBeside(
        lines=(
            _line("slope", (slope, u_slope), _stated(document, "slope_percent"), "%", 1),
            _line("offset", (offset, u_offset), _stated(document, "offset_mV"), "mV", 1),
        ),
        name=probe.name if probe is not None else None,
        url=f"/instruments/{probe.instrument_id}" if probe is not None else None,
        calibration=(
            f"{probe.certificate_number}, {typed_day_words(probe.done_on)}" if probe else ""
        ),
        says=_ADJUSTED if probe is not None else _NO_PROBE,
    )


def _line(
    name: str, found: tuple[float, float], stated: float | None, unit: str, decimals: int
) -> ProbeLine:
    value, u = found
    sign = "+" if unit == "mV" else ""
    return ProbeLine(
        name=name,
        from_curve=f"{value:{sign}.{decimals}f} {unit}",
        u=f"{u:.{decimals}f} {unit}",
        from_buffers="not known" if stated is None else f"{stated:{sign}.{decimals}f} {unit}",
        apart="" if stated is None else f"{value - stated:+.{decimals}f} {unit}",
    )


def _stated(document: Mapping[str, Any], key: str) -> float | None:
    value = document.get(key)
    try:
        return None if value in {None, ""} else float(str(value))
    except ValueError:
        return None
