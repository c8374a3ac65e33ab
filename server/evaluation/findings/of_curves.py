"""Findings about curves: what their points and fits show, the probe, who chose the method."""

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import replace
from typing import Any

from server.evaluation.curve_known import USUAL_FLASK_ML
from server.evaluation.findings.finding import Finding, Verdict, joined, replicates_named
from server.evaluation.findings.of_papers import end_point_finding, probe_finding
from server.evaluation.findings.setting import Setting
from server.evaluation.taken_curve import TakenCurve

_GRAVITY: tuple[Verdict, ...] = ("holds", "look", "fails")
_CURVE_BASIS = "residuals, lag, carbonate, spacing, agreement of the methods: laboratory settings"
_METHOD_BASIS = (
    "the method is the recipe's or somebody's choice; EDQM: standardize with the end point with "
    "which the titrant is used"
)
_SLOPES_APART = 2.0
"""Percent of the ideal slope by which curve and buffers may differ: the program's own setting."""


def curve_findings(setting: Setting) -> Iterator[Finding]:
    """Yield the findings about the curves that count: curve, probe, end point."""
    curves = setting.counting_curves
    if not curves:
        return
    yield _curve(curves)
    yield from _probe(setting, curves)
    yield _end_point(setting, curves)


def _curve(curves: Sequence[TakenCurve]) -> Finding:
    """Tell the worst of what was found in each curve, and in which."""
    notes = [
        (one.label, note)
        for one in curves
        for note in one.found["findings"]
        if note["name"] != "probe"
    ]
    standing_out = [(label, note) for label, note in notes if note["verdict"] != "holds"]
    labels = list(dict.fromkeys(label for label, _ in standing_out))
    verdict = _worst([note["verdict"] for _, note in standing_out])
    if standing_out:
        says = " ".join(_by_name(standing_out))
    else:
        says = f"Nothing stands out on {_curves_of(curves)}."
    says = f"{says} {_carbonate(curves)}".strip()
    return Finding(
        name="curve",
        verdict=verdict,
        says=says,
        basis=_CURVE_BASIS,
        figure=float(len(labels)),
        limit=0.0,
        figure_text=f"{len(labels)} of {len(curves)} curves",
        limit_text="none",
    )


def _by_name(notes: Sequence[tuple[str, Mapping[str, Any]]]) -> Iterator[str]:
    """Yield the worst replicate's words on each kind of note, the worst kinds first."""
    names = dict.fromkeys(note["name"] for _, note in notes)
    grouped = [[(label, note) for label, note in notes if note["name"] == name] for name in names]
    grouped.sort(key=lambda group: -max(_gravity(note["verdict"]) for _, note in group))
    for group in grouped:
        label, worst = max(group, key=lambda one: _gravity(one[1]["verdict"]))
        others = [other for other, _ in group if other != label]
        also = f" The same holds for {replicates_named(others)}." if others else ""
        yield f"Replicate {label}, {worst['name']}: {worst['says']}{also}"


def _carbonate(curves: Sequence[TakenCurve]) -> str:
    """Return the carbonate in the titrant as the fits have it, in words; empty where none has."""
    fits = [one.found["fit"] for one in curves if one.found["fit"] is not None]
    amounts = [fit["carbonate_mol_L"] for fit in fits if fit["carbonate_mol_L"] is not None]
    if not amounts:
        return ""
    low, high = 1000 * min(amounts), 1000 * max(amounts)
    span = f"{low:.2f}" if len(amounts) == 1 else f"{low:.2f} to {high:.2f}"
    return f"Carbonate in the titrant by the fit: {span} mmol/L."


def _probe(setting: Setting, curves: Sequence[TakenCurve]) -> Iterator[Finding]:
    """Set slope and offset from the fits beside the last buffer calibration."""
    fitted = [one for one in curves if one.found["fit"] is not None]
    calibrated = next(probe_finding(setting), None)
    if not fitted:
        if calibrated is not None:
            yield calibrated
        return
    verdict = _worst(
        [
            note["verdict"]
            for one in fitted
            for note in one.found["findings"]
            if note["name"] == "probe"
        ]
    )
    slopes = [100.0 * one.found["fit"]["probe_slope"] for one in fitted]
    offsets = [one.found["fit"]["probe_offset"] for one in fitted]
    mean = sum(slopes) / len(slopes)
    of_ideal = fitted[0].found["kind"] == "mV"
    says = (
        f"From {_curves_of(fitted)} the slope is {_span(slopes, '.1f')} % of "
        f"{'the ideal one' if of_ideal else 'what the meter was set to'}, the offset at pH 7 "
        f"{_span(offsets, '+.2f')} pH."
    )
    if calibrated is None:
        says += " No buffer calibration is at hand to set beside it."
        limit = "95 to 102 %"
        yield Finding(
            name="probe",
            verdict=verdict,
            says=says,
            basis="slope and offset from the model fit: laboratory settings",
            figure=mean,
            limit=95.0,
            unit="%",
            figure_text=f"{mean:.1f} % (curve)",
            limit_text=limit,
        )
        return
    probe = setting.circumstances.probe
    if of_ideal and probe is not None and abs(mean - probe.slope_percent) > _SLOPES_APART:
        verdict = _worst([verdict, "look"])
        says += f" That is more than {_SLOPES_APART:g} % from what the buffers gave."
    yield replace(
        calibrated,
        verdict=_worst([verdict, calibrated.verdict]),
        says=f"{calibrated.says} {says}",
        figure_text=f"{calibrated.figure_text} (buffers); {mean:.1f} % (curve)",
    )


def _end_point(setting: Setting, curves: Sequence[TakenCurve]) -> Finding:
    """Tell by which method the end points were taken, and whose choice it was."""
    seen = setting.circumstances.end_point
    asked = setting.record.end_point.method if setting.record.end_point else None
    methods = list(dict.fromkeys(one.taken for one in curves))
    verdict: Verdict = "holds"
    words = [f"The end point was taken on a curve by {joined(methods)}."]
    proposed = [one for one in curves if not one.stated]
    if proposed:
        verdict = "look"
        which = joined(list(dict.fromkeys(one.taken for one in proposed)))
        words = [f"Nobody named a method for the curve; the program proposed {which}."]
    changed = [one.label for one in curves if one.stated and asked not in {None, one.taken}]
    if changed:
        verdict = "look"
        words.append(f"The recipe takes {asked}; {replicates_named(changed)} took another.")
    if len(methods) > 1:
        verdict = "look"
        words.append("Replicates of one mean were read in different ways.")
    other = [one for one in curves if one.stated and one.proposed != one.taken]
    if other:
        better = joined(list(dict.fromkeys(one.proposed for one in other)))
        labels = replicates_named([one.label for one in other])
        words.append(f"The program would propose {better} for {labels}.")
    if any(one.flask_assumed for one in curves):
        verdict = "look"
        words.append(
            f"The volume in the flask is not stated: the fit took {USUAL_FLASK_ML:g} mL, and half "
            "to twice of it counts in the uncertainty."
        )
    whole = len(setting.counting)
    if len(curves) < whole:
        verdict = "look"
        words.append(f"{whole - len(curves)} of {whole} replicates have no curve.")
    if seen is not None:
        read = end_point_finding(seen)
        if read.verdict != "holds":
            verdict = _worst([verdict, read.verdict])
            words.append(read.says)
    return Finding(
        name="end point",
        verdict=verdict,
        says=" ".join(words),
        basis=_METHOD_BASIS,
        figure_text=joined(methods),
        limit_text=asked or (seen.mode if seen else "a named method"),
    )


def _curves_of(curves: Sequence[TakenCurve]) -> str:
    labels = [one.label for one in curves]
    return f"the curve{'s' if len(labels) > 1 else ''} of {replicates_named(labels)}"


def _span(values: Sequence[float], shape: str) -> str:
    low, high = format(min(values), shape), format(max(values), shape)
    return low if low == high else f"{low} to {high}"


def _gravity(verdict: str) -> int:
    return ("holds", "look", "fails").index(verdict)


def _worst(verdicts: Sequence[str]) -> Verdict:
    return _GRAVITY[max(map(_gravity, verdicts), default=0)]
