"""Methods compared as people read them: three sentences, a picture, and the figures behind them."""

from collections.abc import Iterator, Mapping, Sequence
from math import log10

from server.drawing.strip_plot import Middle, Strip, shape, shape_name, strip_plot
from server.evaluation.methods_compared import (
    ComparedMethods,
    compare_sheets,
    last_certified,
    outcome_of,
)
from server.lab.sheet_facts import SheetFacts
from server.metrology.rounding import rounded
from server.sheets.methods import ComparisonView, MethodRow, PairRow, TestRow
from server.sheets.parts.telling import figure_words, listed
from server.statistics.comparison import Comparison, MethodValues, Pair
from server.statistics.groups import TestResult
from server.statistics.spread import Summary, summarize

UNIT = "mol/L"
#: The limit of a laboratory or recipe that says which difference does not matter.
MARGIN = "method_margin_percent"
_MOST_DECIMALS = 9
_LEAST_P = 0.001
_VERDICTS = {"equal within the margin": "holds", "different": "fails", "not decided": "look"}
_ASKS = {
    "Brown-Forsythe": "do all scatter alike",
    "F test": "do the two scatter alike",
    "Welch's analysis of variance": "have all the same mean",
}
_FEW = 3


def sheet_comparison(facts: SheetFacts) -> ComparisonView | None:
    """Return the methods of one sheet compared; None where it has no curves or no evaluation."""
    sheet = outcome_of(facts)
    if sheet is None or not sheet.result.get("methods"):
        return None
    found = compare_sheets(
        [sheet],
        margin_percent=sheet.limits.method_margin_percent,
        reference=last_certified(sheet),
    )
    return comparison_view(found, margin_basis=sheet.limits.basis(MARGIN))


def comparison_view(found: ComparedMethods, *, margin_basis: str) -> ComparisonView:
    """Return a comparison as shown; ``problem`` says in words why there is none."""
    decimals = _decimals(found.groups)
    made = found.comparison
    return ComparisonView(
        problem=_problem(found),
        precision=made.precision_says if made else "",
        trueness=made.trueness_says if made else "",
        matters=made.matters_says if made else "",
        matters_verdict=_worst(made) if made else "",
        against_taken=" ".join(_against(made, found.taken)) if made else "",
        proposal=_proposal(made, found.taken) if made else "",
        chart=_chart(found, decimals),
        unit=UNIT,
        margin=f"{found.margin_percent:g} %",
        margin_basis=margin_basis,
        reference=_reference(found, decimals),
        rows=tuple(_rows(found, decimals)),
        pairs=tuple(_pair(one) for one in made.pairs) if made else (),
        tests=tuple(_tests(made)) if made else (),
        left_out=tuple(f"{one.method}: {one.why}" for one in found.left_out),
        notes=tuple(_notes(found)),
    )


def _problem(found: ComparedMethods) -> str:
    if found.problem is None:
        return ""
    if not found.sheets:
        return "No evaluated sheet was picked: there is nothing to compare."
    if len(found.groups) == 1:
        return (
            f"Only “{found.groups[0].method}” has two values or more: methods are compared where "
            "curves were taken, or where sheets of the lot used different methods."
        )
    return found.problem


def _decimals(groups: Sequence[MethodValues]) -> int:
    """Return decimals that show about a hundred-thousandth of the values."""
    largest = max((abs(value) for one in groups for value in one.values), default=0.0)
    return min(max(5 - round(log10(largest)), 0), _MOST_DECIMALS) if largest else _MOST_DECIMALS


def _reference(found: ComparedMethods, decimals: int) -> str:
    stated = found.reference
    if stated is None:
        return ""
    U = figure_words(2 * stated.u, 2)
    return f"{stated.name}: {rounded(stated.value, -decimals)} ± {U} {UNIT} (k = 2)"


def _rows(found: ComparedMethods, decimals: int) -> Iterator[MethodRow]:
    true = {one.method: one for one in found.comparison.trueness} if found.comparison else {}
    for place, group in enumerate(found.groups):
        summary = summarize(group.values)
        low, high = summary.ci95 or (None, None)
        against = true.get(group.method)
        yield MethodRow(
            method=group.method,
            mark=shape(place),
            shape=shape_name(place),
            taken=group.method in found.taken,
            n=summary.n,
            mean=rounded(summary.mean, -decimals),
            s=figure_words(summary.s, 2),
            relative_s="" if summary.rsd_percent is None else f"{summary.rsd_percent:.3f} %",
            low="" if low is None else rounded(low, -decimals),
            high="" if high is None else rounded(high, -decimals),
            own_u=_own_u(group, summary),
            trueness="" if against is None else f"{against.difference_percent:+.3f} %",
            En="" if against is None else f"{against.En:.2f}",
        )


def _own_u(group: MethodValues, summary: Summary) -> str:
    if not group.u_systematic or not summary.mean:
        return ""
    return f"{100 * group.u_systematic / abs(summary.mean):.3f} %"


def _pair(one: Pair) -> PairRow:
    low, high = one.ci95_percent
    return PairRow(
        first=one.first,
        second=one.second,
        how="paired" if one.paired else "unpaired",
        difference=f"{one.difference_percent:+.3f} %",
        low=f"{low:+.3f} %",
        high=f"{high:+.3f} %",
        p=_p(one.p),
        p_equal=_p(one.p_equal),
        p_spread="" if one.p_spread is None else _p(one.p_spread),
        verdict=_VERDICTS[one.equality],
        says=one.equality,
    )


def _tests(made: Comparison) -> Iterator[TestRow]:
    """Yield the tests over all methods; those of two stand with the pairs."""
    of_all = made.spread if not any(one.paired for one in made.pairs) else ()
    for one in (*of_all, *((made.means,) if made.means else ())):
        yield _test(one, _ASKS[one.name])


def _test(one: TestResult, asks: str) -> TestRow:
    dof = ", ".join(f"{value:.3g}" for value in one.dof)
    return TestRow(one.name, asks, figure_words(one.statistic, 3), dof, _p(one.p))


def _p(p: float) -> str:
    return f"below {_LEAST_P:g}" if p < _LEAST_P else f"{p:.3f}"


def _worst(made: Comparison) -> str:
    found = {_VERDICTS[one.equality] for one in made.pairs}
    return next(one for one in ("fails", "look", "holds") if one in found)


def _against(made: Comparison, taken: Sequence[str]) -> Iterator[str]:
    """Yield how the method that was taken stands to each other one, in a sentence per outcome."""
    for method in taken:
        beside: dict[str, list[str]] = {}
        for one in made.pairs:
            if method in (one.first, one.second):
                other = one.second if one.first == method else one.first
                beside.setdefault(one.equality, []).append(other)
        if beside:
            words = [f"{name}: {listed(beside[name])}" for name in _VERDICTS if name in beside]
            yield f"Seen from “{method}”, on which the number rests: {'; '.join(words)}."


def _proposal(made: Comparison, taken: Sequence[str]) -> str:
    why = "the mean has the smallest uncertainty, its scatter and the method's own part together"
    if made.trueness and any(one.En <= 1 for one in made.trueness):
        why += ", of those that agree with the reference"
    elif made.trueness:
        why += ", though no method agrees with the reference"
    says = f"Proposed for this recipe: “{made.proposed}”, because {why}."
    if list(taken) == [made.proposed]:
        return f"{says} It is the one that was taken."
    rests = f" The number rests on {listed([f'“{one}”' for one in taken])}." if taken else ""
    return f"{says}{rests} Nothing changes by this sentence: the recipe's keeper chooses."


def _chart(found: ComparedMethods, decimals: int) -> str:
    if not found.groups:
        return ""
    strips = []
    for one in found.groups:
        summary = summarize(one.values)
        strips.append(
            Strip(
                name=one.method,
                values=one.values,
                mean=summary.mean,
                interval=summary.ci95,
                says=_strip_says(summary),
                chosen=one.method in found.taken,
            )
        )
    return strip_plot(strips, _middle(found), decimals=decimals, unit=UNIT)


def _strip_says(summary: Summary) -> str:
    if summary.rsd_percent is None:
        return "n 1"
    return f"n {summary.n}, s {summary.rsd_percent:.3f} %"


def _middle(found: ComparedMethods) -> Middle:
    """Return what the strips are seen against: the reference, else the mean of what was taken."""
    margin = found.margin_percent
    if found.reference is not None:
        return Middle(found.reference.value, found.reference.name, margin)
    means: Mapping[str, float] = {one.method: summarize(one.values).mean for one in found.groups}
    method = next((one for one in found.taken if one in means), found.groups[0].method)
    return Middle(means[method], f"mean of {method}", margin)


def _notes(found: ComparedMethods) -> Iterator[str]:
    made = found.comparison
    if made is None:
        return
    how = {one.paired for one in made.pairs}
    if how == {True}:
        yield "All methods read the same curves, so they are compared curve by curve (paired)."
    elif how == {False}:
        yield "The methods come from different flasks, so they are compared as groups (Welch)."
    else:
        yield (
            "Methods that read the same curves are compared curve by curve (paired), the others as "
            "groups (Welch)."
        )
    if min(len(one.values) for one in found.groups) <= _FEW:
        yield "Three values or fewer see only large differences of spread."
    if len(found.sheets) > 1:
        yield (
            "Values of one sheet share its day, its weighings' balance and its burette: between "
            "sheets a difference may be of the day and not of the method."
        )
    yield (
        "p of a difference is adjusted for the number of pairs (Holm). Equal within the margin "
        "means that both one-sided tests against it hold at 5 %. The spread of two methods is "
        "compared by Pitman and Morgan where they read the same curves, else by Brown and Forsythe."
    )
