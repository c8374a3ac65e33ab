"""The slim strip beside the rows: values so far, what is missing, the first finding."""

from collections.abc import Mapping, Sequence
from typing import Any

from server.evaluation.from_sheet import PreparedSheet
from server.evaluation.running import RunningReplicate, running
from server.lab.sheet_facts import SheetFacts
from server.metrology.rounding import rounded, rounding_exponent, significant
from server.sheets.bench import BenchGroup, FindingView, Margin, MarginReplicate
from server.sheets.parts.outcome import finding_views
from server.sheets.parts.rows import group_by_label, labels_missing
from server.sheets.parts.telling import count_words, listed

_UNIT = "mol/L"
#: A value so far has no U yet: it shows five digits of the nominal concentration.
_DIGITS = 5
_ENTERS_VALUES = frozenset({"temperature", "blank"})


def margin_of(facts: SheetFacts, prepared: PreparedSheet, groups: Sequence[BenchGroup]) -> Margin:
    """Return the strip of a sheet as it stands."""
    recipe = facts.recipe.document
    so_far = running(prepared, wanted=recipe.replicates)
    exponent = rounding_exponent(float(recipe.titrant.nominal), digits=_DIGITS)
    by_label = group_by_label(groups)
    return Margin(
        replicates=tuple(_replicate(one, by_label, exponent) for one in so_far.replicates),
        unit=_UNIT,
        mean=None if so_far.mean is None else rounded(so_far.mean, exponent),
        spread=None if so_far.rsd_percent is None else f"{significant(so_far.rsd_percent)} %",
        to_go=so_far.to_go,
        says=_says(so_far.to_go, groups, some=bool(so_far.replicates)),
        finding=_finding(so_far.finding),
    )


def margin_withheld() -> Margin:
    """Return the strip for somebody who reads no number that is not certified."""
    return Margin(
        replicates=(),
        unit=_UNIT,
        mean=None,
        spread=None,
        to_go=0,
        says="What this sheet comes to is shown once it is countersigned.",
        finding=None,
    )


def _replicate(
    one: RunningReplicate, groups: Mapping[str, BenchGroup], exponent: int
) -> MarginReplicate:
    value = None if one.value is None else rounded(one.value, exponent)
    group = groups.get(one.label)
    to_come = labels_missing(group) if group else ()
    says = ""
    if value is None:
        says = f"{to_come[0]} to come" if to_come else one.says
    return MarginReplicate(label=one.label, value=value, says=says, excluded=one.excluded)


def _says(to_go: int, groups: Sequence[BenchGroup], *, some: bool) -> str:
    """Return how far the sheet has come, and what the values do not hold yet."""
    if to_go:
        says = f"{count_words(to_go, 'more replicate' if some else 'replicate')} to go."
    else:
        says = "All replicates wanted are written."
    waits = [
        row.label
        for group in groups
        for row in group.rows
        if group.replicate == 0
        and row.slot in _ENTERS_VALUES
        and row.required
        and row.value is None
    ]
    if waits and some:
        says += f" Values so far are without: {listed(waits)}."
    return says


def _finding(found: Mapping[str, Any] | None) -> FindingView | None:
    return finding_views([found])[0] if found else None
