"""Findings about the replicates: how many, how far apart, what was left out, against history."""

from collections.abc import Iterator

from server.evaluation.findings.finding import Finding, Verdict, replicates_named
from server.evaluation.findings.setting import Setting
from server.statistics.outliers import chi2_limit, grubbs

ISO_5725 = "ISO 5725-2: Grubbs' test, 5 % straggler, 1 % outlier"


def replicate_findings(setting: Setting) -> Iterator[Finding]:
    """Yield the findings about number, spread, outliers, exclusions, history and two people."""
    yield _number(setting)
    yield _spread(setting)
    yield from _against_budget(setting)
    yield from _outlier(setting)
    yield from _excluded(setting)
    yield from _history(setting)
    yield from _two_people(setting)


def _number(setting: Setting) -> Finding:
    n, limits = setting.evaluation.spread.n, setting.limits
    least, advised = limits.replicates_least, limits.replicates_advised
    enough = n >= least
    count = "One replicate counts" if n == 1 else f"{n} replicates count"
    if not enough:
        says = f"{count}; at least {least} are needed, {advised} advised."
    else:
        says = f"{count}." if n >= advised else f"{count}; {advised} are advised."
    return Finding(
        name="replicates",
        verdict="holds" if enough else "fails",
        says=says,
        basis=limits.basis("replicates_least"),
        figure=float(n),
        limit=float(least),
        figure_text=str(n),
        limit_text=f"at least {least}, {advised} advised",
    )


def _spread(setting: Setting) -> Finding:
    spread, limit = setting.evaluation.spread, setting.limits.spread_percent
    basis = setting.limits.basis("spread_percent")
    if spread.rsd_percent is None:
        says = "One replicate has no spread; nothing shows how well it repeats."
        return Finding("spread", "look", says, basis, None, limit, "%", "none", f"{limit:.2f} %")
    holds = spread.rsd_percent <= limit
    text = f"{spread.rsd_percent:.2f} %"
    says = (
        f"Your replicates scatter by {text} (relative s), "
        f"{'within' if holds else 'more than'} the limit of {limit:.2f} %."
    )
    verdict: Verdict = "holds" if holds else "fails"
    return Finding(
        "spread", verdict, says, basis, spread.rsd_percent, limit, "%", text, f"{limit:.2f} %"
    )


def _against_budget(setting: Setting) -> Iterator[Finding]:
    """Compare s with the repeatability that the budget took as known (χ², 95 %)."""
    used, n = setting.evaluation.repeatability, setting.evaluation.spread.n
    if not used.one_s or used.own_s is None:
        return
    figure, limit = (n - 1) * (used.own_s / used.one_s) ** 2, chi2_limit(n - 1)
    holds = figure <= limit
    says = (
        f"The budget expects {100 * used.one_s:.3f} % from replicate to replicate; this run shows "
        f"{100 * used.own_s:.3f} %, {'which fits' if holds else 'more than chance explains'}."
    )
    yield Finding(
        name="spread and budget",
        verdict="holds" if holds else "look",
        says=says,
        basis="χ² test of s against the repeatability in the budget, 95 %",
        figure=figure,
        limit=limit,
        figure_text=f"χ² {figure:.1f}",
        limit_text=f"{limit:.1f}",
    )


def _outlier(setting: Setting) -> Iterator[Finding]:
    values, spread = setting.values, setting.evaluation.spread
    if len(values) < 3 or not spread.s:
        return
    found = grubbs(values)
    label = setting.counting[found.which][1].label
    verdict: Verdict = "holds"
    says = f"Replicate {label} lies farthest from the mean, but not farther than chance explains."
    if found.critical_1 < found.G:
        verdict, says = "fails", f"Replicate {label} is an outlier (beyond the 1 % limit)."
    elif found.critical_5 < found.G:
        verdict, says = "look", f"Replicate {label} is a straggler (beyond the 5 % limit)."
    if len(values) == 3:
        says += " With three values this test has almost no power: it can hardly find anything."
    yield Finding(
        name="outlier",
        verdict=verdict,
        says=says,
        basis=ISO_5725,
        figure=found.G,
        limit=found.critical_5,
        figure_text=f"G {found.G:.3f}",
        limit_text=f"{found.critical_5:.3f} (5 %), {found.critical_1:.3f} (1 %)",
    )


def _excluded(setting: Setting) -> Iterator[Finding]:
    """Tell what was left out, why, and what the result would be with it."""
    left_out = [one for one in setting.record.replicates if one.excluded is not None]
    if not left_out:
        return
    reasons = "; ".join(f"{one.label}: {one.excluded}" for one in left_out)
    says = f"You left out {replicates_named([one.label for one in left_out])} ({reasons})."
    shift = None
    if setting.with_all is None:
        says += " No value came of it."
    else:
        shift = 100.0 * (setting.with_all.value / setting.evaluation.value - 1.0)
        says += f" With it the mean would be {setting.with_all.value:.6g} "
        says += f"{setting.record.unit}, {shift:+.3f} %."
    yield Finding(
        name="excluded",
        verdict="look",
        says=says,
        basis="MHRA data integrity guidance: nothing measured is hidden; the reason is recorded",
        figure=shift,
        unit="%",
        figure_text="" if shift is None else f"{shift:+.3f} %",
    )


def _history(setting: Setting) -> Iterator[Finding]:
    """Compare s with the stated or pooled repeatability of one replicate (F, 95 %)."""
    used = setting.evaluation.repeatability
    if used.one_s is None or used.own_s is None or used.limit is None:
        return
    figure, limit = 100.0 * used.own_s, 100.0 * used.limit
    verdict: Verdict
    if figure <= limit:
        verdict, says = "holds", "This run repeats as well as its history or validation says."
    elif used.own:
        verdict = "look"
        says = (
            f"This run scatters by {figure:.3f} %, more than its history allows; its own spread "
            "counts in the uncertainty."
        )
    else:
        verdict = "fails"
        says = (
            f"This run scatters by {figure:.3f} %, more than the stated repeatability allows "
            f"({limit:.3f} %), and yet the stated one counts in the uncertainty."
        )
    yield Finding(
        name="history",
        verdict=verdict,
        says=says,
        basis="F test of s² against the pooled or validated one, 95 %",
        figure=figure,
        limit=limit,
        unit="%",
        figure_text=f"{figure:.3f} %",
        limit_text=f"{limit:.3f} %",
    )


def _two_people(setting: Setting) -> Iterator[Finding]:
    """GB/T 601: two people, four replicates each, relative range of each and of all."""
    circumstances, limits = setting.circumstances, setting.limits
    if not circumstances.two_people:
        return
    by_person: dict[str, list[float]] = {}
    if len(circumstances.analysts) == len(setting.evaluation.replicates):
        for name, one in zip(circumstances.analysts, setting.evaluation.replicates, strict=True):
            if one.excluded is None and one.value is not None:
                by_person.setdefault(name, []).append(one.value)
    enough = [values for values in by_person.values() if len(values) >= 4]
    if len(enough) < 2:
        says = "The recipe asks for two people with four replicates each; that is not there yet."
        yield Finding("two people", "fails", says, limits.basis("range_two_percent"))
        return
    each = max(_relative_range(values) for values in enough)
    both = _relative_range([value for values in enough for value in values])
    holds = each <= limits.range_one_percent and both <= limits.range_two_percent
    yield Finding(
        name="two people",
        verdict="holds" if holds else "fails",
        says=f"The wider of the two ranges is {each:.3f} %, that of both together {both:.3f} %.",
        basis=f"{limits.basis('range_one_percent')}; {limits.basis('range_two_percent')}",
        figure=both,
        limit=limits.range_two_percent,
        unit="%",
        figure_text=f"{each:.3f} % and {both:.3f} %",
        limit_text=f"{limits.range_one_percent:.2f} % and {limits.range_two_percent:.2f} %",
    )


def _relative_range(values: list[float]) -> float:
    """Return (largest − smallest)/mean in percent."""
    return 100.0 * (max(values) - min(values)) * len(values) / sum(values)
