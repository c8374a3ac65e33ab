"""Findings about what the result rests on: dates, drying, probe, end point, earlier certificate."""

import math
from collections.abc import Iterator

from server.evaluation.circumstances import EndPoint, LastCertificate
from server.evaluation.findings.finding import Finding, Verdict, joined
from server.evaluation.findings.setting import Setting


def paper_findings(setting: Setting) -> Iterator[Finding]:
    """Yield the findings about dates, drying, probe, checks, end point, last certificate."""
    yield from _in_date(setting)
    yield from _drying(setting)
    if not setting.counting_curves:
        yield from probe_finding(setting)
    yield from _interim(setting)
    if setting.circumstances.end_point is not None and not setting.counting_curves:
        yield end_point_finding(setting.circumstances.end_point)
    if setting.circumstances.last_certificate is not None:
        yield _last_certificate(setting, setting.circumstances.last_certificate)


def _in_date(setting: Setting) -> Iterator[Finding]:
    things = setting.circumstances.in_date
    if not things:
        return
    lapsed = [one for one in things if not one.in_date]
    overridden = [one for one in lapsed if one.override]
    verdict: Verdict = "holds"
    says = f"In date when used: {joined([one.what for one in things])}."
    if lapsed:
        verdict = "look" if len(overridden) == len(lapsed) else "fails"
        words = [
            f"{one.what} (due {one.due or 'not known'}"
            f"{f', used all the same: {one.override}' if one.override else ''})"
            for one in lapsed
        ]
        says = f"Out of date when used: {joined(words)}."
    yield Finding(
        name="in date",
        verdict=verdict,
        says=says,
        basis="ISO/IEC 17025, 6.4: only what is in date is used",
        figure=float(len(lapsed)),
        limit=0.0,
        figure_text=f"{len(lapsed)} of {len(things)} out of date",
        limit_text="none",
    )


def _drying(setting: Setting) -> Iterator[Finding]:
    drying, standard = setting.circumstances.drying, setting.record.standard
    dried = standard is not None and standard.basis == "dried" and setting.record.weighs
    basis = "the mass fraction holds on the basis that the lot's certificate names"
    if drying is None:
        if dried:
            says = "The mass fraction is on the dried basis; no drying entry is at hand."
            yield Finding("drying", "look", says, basis)
        return
    if drying.verdict is not None:
        judged: Verdict = "holds" if drying.verdict == "holds" else "look"
        if drying.verdict == "fails":
            judged = "fails"
        says = f"The certificate asks for {drying.required}. {drying.says}"
        done = drying.recorded or "none"
        yield Finding("drying", judged, says, basis, figure_text=done, limit_text=drying.required)
        return
    if drying.recorded is not None:
        says = f"The certificate asks for {drying.required}; recorded: {drying.recorded}."
        yield Finding("drying", "holds", says, basis, figure_text=drying.recorded)
        return
    says = f"The certificate asks for {drying.required}; no drying is recorded."
    yield Finding("drying", "fails" if dried else "look", says, basis, figure_text="none")


def probe_finding(setting: Setting) -> Iterator[Finding]:
    """Yield what the last buffer calibration says of the probe, where there was one."""
    probe, limits = setting.circumstances.probe, setting.limits
    if probe is None:
        return
    low, high = limits.slope_least_percent, limits.slope_most_percent
    slope_holds = low <= probe.slope_percent <= high
    offset_holds = abs(probe.offset_mV) <= limits.offset_most_mV
    says = (
        f"The probe's slope is {probe.slope_percent:.1f} % of Nernst "
        f"({'within' if slope_holds else 'outside'} {low:g} to {high:g} %), its offset "
        f"{probe.offset_mV:+.1f} mV ({'within' if offset_holds else 'outside'} "
        f"±{limits.offset_most_mV:g} mV)."
    )
    yield Finding(
        name="probe",
        verdict="holds" if slope_holds and offset_holds else "fails",
        says=says,
        basis=limits.basis("slope_least_percent"),
        figure=probe.slope_percent,
        limit=low,
        unit="%",
        figure_text=f"{probe.slope_percent:.1f} %, {probe.offset_mV:+.1f} mV",
        limit_text=f"{low:g} to {high:g} %, ±{limits.offset_most_mV:g} mV",
    )


def _interim(setting: Setting) -> Iterator[Finding]:
    """Tell the checks between two calibrations; one is wanted on the day of use."""
    for one in setting.circumstances.interim:
        if one.on is None or one.on != one.used:
            last = f"the last was on {one.on}" if one.on else "there was none before"
            says = f"{one.thing}: no {one.name} on the day of use, {one.used}; {last}."
            verdict: Verdict = "fails" if one.verdict == "fails" else "look"
            says += f" {one.says}" if one.verdict == "fails" else ""
        else:
            verdict = {"fails": "fails", "look": "look"}.get(one.verdict or "", "holds")  # type: ignore[assignment]
            says = f"{one.thing}, {one.name} on {one.on}: {one.says}"
        yield Finding(
            name=one.name,
            verdict=verdict,
            says=says,
            basis=f"ISO/IEC 17025, 6.4.10: intermediate checks. {one.basis}".strip(),
            figure_text=one.on or "none",
            limit_text=one.used,
        )


def end_point_finding(seen: EndPoint) -> Finding:
    """Compare the end point as seen with the recipe's, and with the titrant's use (EDQM)."""
    verdict: Verdict = "holds"
    used = seen.indicator_used or seen.indicator_expected
    says = f"The end point was read {seen.mode}" + (f" with {used}." if used else ".")
    other = seen.indicator_used not in {None, seen.indicator_expected}
    if other and seen.indicator_expected is not None:
        verdict = "fails"
        says = f"{seen.indicator_used} was used; the recipe asks for {seen.indicator_expected}."
    elif seen.indicator_expected is not None and seen.indicator_used is None:
        verdict = "look"
        says = f"The recipe asks for {seen.indicator_expected}; which was used is not written."
    elif seen.used_with is not None and seen.used_with != seen.mode:
        verdict = "look"
        says += f" The titrant is used with a {seen.used_with} end point: the two may differ."
    return Finding(
        name="end point",
        verdict=verdict,
        says=says,
        basis="EDQM: standardize with the end point with which the titrant is used",
        figure_text=used or seen.mode,
        limit_text=seen.indicator_expected or seen.mode,
    )


def _last_certificate(setting: Setting, last: LastCertificate) -> Finding:
    """Compare with the lot's earlier value; what both rest on cancels in the difference."""
    value, u = setting.evaluation.value, setting.evaluation.u
    difference = value - last.value
    u_difference = unshared_u(
        (value, u, setting.components), (last.value, last.u, dict(last.components))
    )
    limit = 2.0 * u_difference
    holds = abs(difference) <= limit
    relative = 100.0 * difference / last.value
    says = (
        f"The lot is {abs(relative):.3f} % {'above' if difference >= 0 else 'below'} certificate "
        f"{last.number}, {'within' if holds else 'more than'} twice the uncertainty of the "
        f"difference ({100.0 * limit / last.value:.3f} %)."
    )
    return Finding(
        name="last certificate",
        verdict="holds" if holds else "fails",
        says=says,
        basis="|Δc| ≤ 2·u(Δ), u(Δ) from what the two values do not share",
        figure=difference,
        limit=limit,
        unit=setting.record.unit,
        figure_text=f"{relative:+.3f} %",
        limit_text=f"±{100.0 * limit / last.value:.3f} %",
    )


def unshared_u(
    one: tuple[float, float, dict[str, float]], other: tuple[float, float, dict[str, float]]
) -> float:
    """Return u of the difference of two values (value, u, components by root), roots cancelling.

    Both in one unit; components relative and signed. Each root's two contributions are subtracted
    before squaring (JCGM 100, 5.2: fully correlated inputs); what no root names is independent.
    """
    squares = 0.0
    for value, u, components in (one, other):
        named = sum((value * relative) ** 2 for relative in components.values())
        squares += max(0.0, u**2 - named)
    for root in one[2].keys() | other[2].keys():
        squares += (one[0] * one[2].get(root, 0.0) - other[0] * other[2].get(root, 0.0)) ** 2
    return math.sqrt(squares)
