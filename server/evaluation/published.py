"""The calculations against published examples that come with the program."""

import json
import math
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from decimal import Decimal
from typing import Any

from server.chemistry.formula import molar_mass
from server.evaluation.entrance import evaluate
from server.files import find_folder
from server.metrology.air import cipm_2007, iso_tr_20461
from server.metrology.buoyancy import factor
from server.metrology.coverage import coverage_factor
from server.metrology.decimal_text import decimals_of
from server.metrology.glassware import z_factor
from server.metrology.monte_carlo import simulate
from server.metrology.propagation import Input, Propagated, propagate
from server.metrology.water import density
from server.statistics.outliers import critical_grubbs, grubbs

MMHG_HPA = 1.33322387415


@dataclass(frozen=True, slots=True)
class Check:
    """One published value beside the computed one; it holds where the printed digits agree."""

    source: str
    what: str
    published: str
    computed: str
    agreement: str
    holds: bool


def checks() -> list[Check]:
    """Return all checks against the published examples that come with the program."""
    held = json.loads((find_folder("seed_data") / "published.json").read_text(encoding="utf-8"))
    return [
        *_bench_records(held["bench_records"]),
        *_quam_a1(held["quam_a1"]),
        *_gum_h1(held["gum_h1"]),
        *_jcgm101(held["jcgm101_9_3"]),
        *_water(held["water"]),
        *_air(held["air"], held["air_sop2"]),
        *_z_factors(held["z"]),
        *_buoyancy(held["buoyancy"]),
        *_molar_masses(held["molar_masses"]),
        *_grubbs(held["grubbs"], held["grubbs_table"]),
    ]


def _printed(source: str, what: str, published: str, computed: float, *, slack: int = 0) -> Check:
    """Return a check to the published value's last digit; ``slack`` allows units more of it."""
    unit = 10.0 ** -decimals_of(published)
    apart = computed - float(published)
    # half a unit is rounding itself; a trailing bit more is the binary fraction's
    holds = abs(apart) <= (0.5 + slack) * unit * (1.0 + 1e-9)
    shown = f"{computed:.{decimals_of(published) + 2}f}"
    return Check(source, what, published, shown, f"{apart / unit:+.2f} of the last digit", holds)


def _within(source: str, what: str, published: str, computed: float, *, relative: float) -> Check:
    """Return a check within a stated relative difference."""
    apart = computed / float(published) - 1.0
    shown = f"{computed:.{decimals_of(published) + 1}f}"
    return Check(source, what, published, shown, f"{apart:+.1e} relative", abs(apart) <= relative)


def _bench_records(examples: list[Mapping[str, Any]]) -> Iterator[Check]:
    for one in examples:
        found = evaluate(one["record"])["concentration"]
        yield _printed(one["source"], one["what"], one["c"], found["value"])
        yield _printed(one["source"], f"u of {one['what']}", one["u"], found["u"])


def _quam_a1(held: Mapping[str, Any]) -> Iterator[Check]:
    """Cadmium standard: c = 1000·m·P/V; the volume has three parts."""
    (p, p_bound), (m, m_u) = (map(float, held[key]) for key in ("P", "m_mg"))
    volume, calibration, repeat, temperature = map(float, held["V_mL"])
    inputs = [
        Input("P", p, p_bound / math.sqrt(3)),
        Input("m", m, m_u),
        Input("V", volume, calibration / math.sqrt(6)),
        Input("filling", 0.0, repeat),
        Input("expansion", 0.0, temperature / math.sqrt(3)),
    ]
    found = propagate(
        lambda x: 1000.0 * x["m"] * x["P"] / (x["V"] + x["filling"] + x["expansion"]), inputs
    )
    yield _printed(held["source"], "c(Cd), mg/L", held["c"], found.value)
    # the guide adds parts that it has rounded; unrounded they give 0.835
    yield _printed(held["source"], "u(c), mg/L, unrounded parts", held["u"], found.u, slack=1)


def end_gauge() -> Propagated:
    """Return the end gauge of JCGM 100, H.1, in nanometres."""
    inputs = [
        Input("l_s", 50_000_623.0, 25.0, dof=18),
        Input("d", 215.0, 5.8, dof=24),
        Input("d_random", 0.0, 3.9, dof=5),
        Input("d_systematic", 0.0, 6.7, dof=8),
        Input("alpha_s", 11.5e-6, 2e-6 / math.sqrt(3)),
        Input("delta_alpha", 0.0, 1e-6 / math.sqrt(3), dof=50),
        Input("theta", -0.1, 0.41),
        Input("delta_theta", 0.0, 0.05 / math.sqrt(3), dof=2),
    ]

    def length(x: Mapping[str, Any]) -> Any:
        d = x["d"] + x["d_random"] + x["d_systematic"]
        expansion = x["delta_alpha"] * x["theta"] + x["alpha_s"] * x["delta_theta"]
        return x["l_s"] + d - x["l_s"] * expansion

    return propagate(length, inputs)


def _gum_h1(held: Mapping[str, Any]) -> Iterator[Check]:
    found = end_gauge()
    dof = found.dof or math.inf
    # H.1 truncates ν to 16 before it takes t, and multiplies t by the rounded u of 32: a unit more
    expanded = found.u * coverage_factor(float(int(dof)), 0.99)
    yield _printed(held["source"], "length, nm", held["l"], found.value)
    yield _printed(held["source"], "u(l), nm", held["u"], found.u)
    yield _printed(held["source"], "ν_eff, truncated", held["nu_eff"], float(int(dof)))
    yield _printed(held["source"], "U(99 %), nm", held["U99"], expanded, slack=1)


def _jcgm101(held: Mapping[str, Any]) -> Iterator[Check]:
    """Mass calibration: first order misses 28 % of u, and the validation must say so."""
    inputs = [
        Input("reference", 100_000.0, 0.05),
        Input("added", 1.234, 0.02),
        Input("air", 1.2, 0.1 / math.sqrt(3), shape="rectangular", half_width=0.1),
        Input("weight", 8000.0, 1000 / math.sqrt(3), shape="rectangular", half_width=1000.0),
        Input("standard", 8000.0, 50 / math.sqrt(3), shape="rectangular", half_width=50.0),
    ]

    def mass(x: Mapping[str, Any]) -> Any:
        buoyancy = (x["air"] - 1.2) * (1.0 / x["weight"] - 1.0 / x["standard"])
        return (x["reference"] + x["added"]) * (1.0 + buoyancy) - 100_000.0

    first = propagate(mass, inputs)
    half = coverage_factor(None, 0.95) * first.u
    found = simulate(
        mass, inputs, seed=1, coverage=0.95, trials=1_000_000,
        first_order=(first.value - half, first.value + half), u=first.u,
    )  # fmt: skip
    source = held["source"]
    yield _printed(source, "first order: value, mg", held["first_order"][0], first.value)
    yield _printed(source, "first order: u, mg", held["first_order"][1], first.u)
    names = ("value", "u", "low end", "high end")
    values = (found.value, found.u or math.nan, found.low, found.high)
    for name, published, computed in zip(names, held["monte_carlo"], values, strict=True):
        # 1e6 trials leave the last printed digits uncertain
        check = _within(source, f"Monte Carlo: {name}, mg", published, computed, relative=2e-3)
        yield check
    says = "not validated" if not found.first_order_validated else "validated"
    yield Check(source, "first order", "not validated", says, "", says == "not validated")


def _water(held: Mapping[str, Any]) -> Iterator[Check]:
    for t, published in held["kg_m3"].items():
        text = f"{published:.4f}"
        yield _printed(held["source"], f"ρ(water, {t} °C), kg/m3", text, density(float(t)))


def _air(cipm: Mapping[str, Any], sop: Mapping[str, Any]) -> Iterator[Check]:
    for held, relative in ((cipm, 5e-5), (sop, 2e-4)):
        for t, p, h, published in held["rows"]:
            what = f"ρ(air, {t:g} °C, {p:g} mmHg, {h:g} %), kg/m3"
            computed = float(cipm_2007(t, p * MMHG_HPA, h))
            yield _within(held["source"], what, f"{published:g}", computed, relative=relative)


def _z_factors(held: Mapping[str, Any]) -> Iterator[Check]:
    boundary = {(t, kpa) for t, kpa in held["boundary"]}
    for kpa, row in held["kPa"].items():
        for t, published in zip(held["t_C"], row, strict=True):
            pressure = float(kpa)
            air = iso_tr_20461(t, 10.0 * pressure, 50.0)
            slack = 1 if (t, pressure) in boundary else 0
            yield _printed(
                held["source"], f"Z({t:g} °C, {kpa} kPa), µL/mg", f"{published:.4f}",
                z_factor(density(t), air), slack=slack,
            )  # fmt: skip


def _buoyancy(rows: list[Mapping[str, Any]]) -> Iterator[Check]:
    for one in rows:
        mass = float(one["apparent_g"]) * factor(1.2, float(one["density"]))
        yield _printed(one["source"], f"mass of {one['what']}, g", one["true_g"], mass)


def _molar_masses(held: Mapping[str, Any]) -> Iterator[Check]:
    for formula, (value, u) in held["rows"].items():
        found = molar_mass(formula)
        yield _printed(held["source"], f"M({formula}), g/mol", value, found.value)
        yield _printed(held["source"], f"u(M({formula})), g/mol", u, found.u)


def _grubbs(example: Mapping[str, Any], table: Mapping[str, Any]) -> Iterator[Check]:
    found = grubbs(example["x"])
    one_sided = critical_grubbs(len(example["x"]), 0.05, sides=1)
    yield _printed(example["source"], "G", example["G"], found.G)
    critical = example["critical_one_sided_5"]
    yield _printed(example["source"], "critical value, one-sided, 5 %", critical, one_sided)
    for n, published in table["rows"].items():
        for level, value in zip((0.05, 0.01), published, strict=True):
            what = f"Grubbs, n = {n}, {Decimal(str(level)) * 100:g} %"
            yield _printed(table["source"], what, f"{value:.4f}", critical_grubbs(int(n), level))
