"""A bench result as people read it: the number, findings, budget, replicates, pictures."""

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from server.drawing.bars import Bar, budget_bars
from server.drawing.dots import Dot, replicate_dots
from server.metrology.decimal_text import decimals_of
from server.metrology.rounding import printed_k, rounded, rounded_pair, rounding_exponent
from server.sheets.bench import FindingView
from server.sheets.countersign import BudgetRow, ReplicateRow
from server.sheets.parts.telling import count_words, figure_words, plain_words, unit_words

_SMALL_PERCENT = 1.0
_INTERVAL = "interval "
_FORMULAS = {
    "weighed": "c = r · 1000 · m · B · w / (M · V)",
    "aliquot": "c = r · c(standard) · V(pipette) · F(pipette) / V",
    "against-titrant": "c = r · c(reference) · V(pipette) · F(pipette) / V with the unknown in the "
    "burette, c = r · c(reference) · V / (V(pipette) · F(pipette)) with the unknown in the flask",
}
_SYMBOLS = {
    "weighed": "m mass of the standard from two indications of the balance, B air buoyancy, "
    "w mass fraction, M molar mass, r amount of titrant per amount of standard",
    "aliquot": "r amount of titrant per amount of standard, F a volume's factor to 20 °C",
    "against-titrant": "r amount of titrant per amount of reference, F a volume's factor to 20 °C",
}
_VOLUME = (
    "V = (burette end − start, each with its error, all fillings) · F − blank − excess, at 20 °C"
)


@dataclass(frozen=True, slots=True)
class Printed:
    """A concentration digit by digit as it is printed.

    ``interval`` holds the Monte Carlo interval where it is the one to print, else it is empty;
    ``beside`` is what stands beside the value: that interval, or U; ``coverage`` is of ``beside``.
    """

    value: str
    uncertainty: str
    unit: str
    k: str
    beside: str
    coverage: str
    factor: str
    decimals: int
    interval: str


def printed(result: Mapping[str, Any]) -> Printed:
    """Return a bench result's concentration and factor in the digits that U gives them."""
    c = result["concentration"]
    value, uncertainty = rounded_pair(c["value"], c["U"])
    _, _, interval = c["reported"].partition(_INTERVAL)
    k, coverage = printed_k(c["k"]), f"{100 * c['coverage']:g} %"
    ends, _, by = interval.partition(" (")
    return Printed(
        value=value,
        uncertainty=uncertainty,
        unit=c["unit"],
        k=k,
        beside=ends or f"± {uncertainty} {c['unit']}",
        coverage=f"interval of {coverage} ({by}" if interval else f"k = {k}, {coverage}",
        factor=_factor(result),
        decimals=decimals_of(value),
        interval=interval,
    )


def _factor(result: Mapping[str, Any]) -> str:
    """Return the factor to the digits of its U: relative, that of the concentration."""
    c, factor = result["concentration"], result["factor"]
    U = factor * c["U"] / c["value"]
    return rounded(factor, rounding_exponent(U)) if U > 0 else figure_words(factor)


def finding_views(
    findings: Iterable[Mapping[str, Any]],
    *,
    reasons: Mapping[str, str] | None = None,
    accepted: Sequence[str] = (),
    accepted_by: str | None = None,
) -> tuple[FindingView, ...]:
    """Return findings in their order, which is that of gravity: fails, look, holds."""
    return tuple(
        FindingView(
            name=one["name"],
            verdict=one["verdict"],
            says=one["says"],
            figure=one["figure_text"],
            limit=one["limit_text"],
            basis=one["basis"],
            reason=(reasons or {}).get(one["name"], one.get("reason")),
            accepted_by=(accepted_by if one["name"] in accepted else one.get("accepted_by")),
        )
        for one in findings
    )


def failing_names(findings: Iterable[Mapping[str, Any]]) -> tuple[str, ...]:
    """Return the names of the findings that fail, once each."""
    return tuple(dict.fromkeys(one["name"] for one in findings if one["verdict"] == "fails"))


def replicate_rows(result: Mapping[str, Any]) -> tuple[ReplicateRow, ...]:
    """Return the replicates, also those left out, with the decimals of the printed value."""
    decimals = printed(result).decimals
    return tuple(
        ReplicateRow(
            label=one["label"],
            value="" if one["value"] is None else rounded(one["value"], -decimals),
            mass=_at_decimals(one["mass_g"], 5, "g"),
            amount=_at_decimals(one["amount_mmol"], 4, "mmol"),
            volume=_at_decimals(one["volume_mL"], 3, "mL"),
            excluded=one["excluded"],
        )
        for one in result["replicates"]
    )


def dots(result: Mapping[str, Any]) -> str:
    """Return the picture of the replicates around their mean."""
    spread = result["spread"]
    low, high = spread["ci95"] or (None, None)
    shown = [
        Dot(one["label"], one["value"], one["excluded"] is not None)
        for one in result["replicates"]
        if one["value"] is not None
    ]
    return replicate_dots(
        shown,
        mean=spread["mean"],
        low=low,
        high=high,
        decimals=printed(result).decimals,
        unit=result["concentration"]["unit"],
    )


def dots_says(result: Mapping[str, Any]) -> str:
    """Return n, s and the interval of the mean in a sentence."""
    spread, unit = result["spread"], result["concentration"]["unit"]
    count = count_words(spread["n"], "replicate counts", "replicates count")
    if spread["s"] is None or spread["ci95"] is None:
        return f"{count}; one value has no spread."
    decimals = printed(result).decimals
    low, high = (rounded(end, -decimals) for end in spread["ci95"])
    return (
        f"{count}; s {figure_words(spread['s'], 2)} {unit}, relative s "
        f"{figure_words(spread['rsd_percent'], 2)} %; 95 % interval of the mean {low} to {high} "
        f"{unit}."
    )


def budget_rows(result: Mapping[str, Any], urls: Mapping[str, str]) -> tuple[BudgetRow, ...]:
    """Return the budget, the largest share first; ``urls`` are the pages of its roots."""
    return tuple(_budget_row(one, urls) for one in _by_share(result))


def bars(result: Mapping[str, Any]) -> str:
    """Return the picture of the shares; sources under 1 % stand together in the last bar."""
    ordered = _by_share(result)
    large = [one for one in ordered if abs(one["share_percent"]) >= _SMALL_PERCENT]
    small = [one for one in ordered if one not in large and one["u"] > 0]
    shown = [Bar(one["source"], one["share_percent"], one["shared"]) for one in large]
    if small:
        words = count_words(len(small), "smaller source", "smaller sources together")
        together = sum(one["share_percent"] for one in small)
        shown.append(Bar(words, together, any(one["shared"] for one in small)))
    return budget_bars(shown)


def budget_says(result: Mapping[str, Any]) -> str:
    """Return what dominates, and how much of it more replicates would not make smaller."""
    ordered = _by_share(result)
    if not ordered:
        return ""
    shared = sum(one["share_percent"] for one in ordered if one["shared"])
    return (
        f"The largest part is {ordered[0]['source']}, {_percent(ordered[0]['share_percent'])}. "
        f"{_percent(shared)} is the same in every replicate: more replicates do not make it "
        "smaller."
    )


def monte_carlo_says(result: Mapping[str, Any]) -> str:
    """Return the Monte Carlo outcome in a sentence."""
    run = result["monte_carlo"]
    if run is None:
        return "not run"
    unit, decimals = result["concentration"]["unit"], printed(result).decimals
    low, high = (rounded(run[end], -decimals - 1) for end in ("low", "high"))
    u = "u not defined (an input has two degrees of freedom or fewer)"
    if run["u"] is not None:
        u = f"u {figure_words(run['u'], 2)} {unit}"
    verdict = (
        f"first order is validated to {count_words(run['digits'], 'digit')} of u"
        if run["first_order_validated"]
        else "first order is not validated, so this interval is the one printed"
    )
    trials = f"{run['trials']:,}".replace(",", " ")
    return (
        f"{trials} trials, seed {run['seed']}: {u}, 95 % interval {low} to {high} {unit}; "
        f"{verdict} (JCGM 101)"
    )


def constants(result: Mapping[str, Any]) -> tuple[tuple[str, str], ...]:
    """Return the constants that entered, each with its source."""
    held = result["constants"]
    ratio = held["ratio"]
    found = [("ratio, titrant per standard", f"{ratio['value']} ({ratio['source']})")]
    found += [
        (key.replace("_", " "), _constant(held[key]))
        for key in ("molar_mass", "density")
        if key in held
    ]
    if "atomic_weights" in held:
        found.append(("atomic weights", held["atomic_weights"]))
    found += [(f"model of {name}", words) for name, words in held["models"].items()]
    return tuple(found)


def formula(route: str) -> str:
    """Return the route's formula with its symbols in words."""
    return f"{_FORMULAS[route]}; {_VOLUME}. {_SYMBOLS[route]}."


def calculation(result: Mapping[str, Any]) -> str:
    """Return name and version of the calculation."""
    named = result["calculation"]
    return f"{named['name']}, version {named['version']}"


def _by_share(result: Mapping[str, Any]) -> list[Mapping[str, Any]]:
    return sorted(result["budget"], key=lambda one: -one["share_percent"])


def _budget_row(one: Mapping[str, Any], urls: Mapping[str, str]) -> BudgetRow:
    root = (one["id"] or "").partition(":")[0]
    return BudgetRow(
        source=one["source"],
        value=f"{plain_words(one['value'])} {unit_words(one['unit'])}".strip(),
        u=figure_words(one["u"], 2),
        dof="∞" if one["dof"] is None else plain_words(one["dof"], 3),
        shape=one["shape"],
        sensitivity=figure_words(one["sensitivity"], 3),
        contribution=figure_words(one["contribution"], 2),
        share=_percent(one["share_percent"]),
        shared=one["shared"],
        root=urls.get(root),
    )


def _percent(share: float) -> str:
    if share == 0:
        return "0 %"
    return "< 1 %" if abs(share) < _SMALL_PERCENT / 2 else f"{share:.0f} %".replace("-", "−")


def _constant(held: Mapping[str, Any]) -> str:
    u = f", u = {figure_words(held['u'], 2)}" if held["u"] else ", taken as exact"
    return f"{plain_words(held['value'])} {unit_words(held['unit'])}{u} ({held['source']})"


def _at_decimals(value: float | None, decimals: int, unit: str) -> str:
    """Return what a replicate's value comes from, with one decimal more than is usually read."""
    return "" if value is None else f"{rounded(value, -decimals)} {unit}"
