"""Findings about the measurement: burette, resolution, masses, temperature, blank, nominal."""

from collections.abc import Iterator

from server.evaluation.findings.finding import Finding, Verdict, joined, replicates_named
from server.evaluation.findings.setting import Setting
from server.metrology.decimal_text import decimals_of

# Their indicator answers only after a measurable excess, or their solutions use titrant themselves.
_NEEDS_BLANK = {
    "KMnO4": "Permanganate titrations need a blank: the colour shows only in excess.",
    "I2": "Iodine titrations need a blank: the colour shows only in excess.",
}
_DILUTE_MOL_L = 0.2  # water's expansion serves to about 0.1 mol/L; a titrant near it passes
_CONCENTRATED_MOL_L = 1.0


def measurement_findings(setting: Setting) -> Iterator[Finding]:
    """Yield the findings about nominal value, burette, resolution, mass, temperature and blank."""
    yield _nominal(setting)
    yield from _burette_use(setting)
    yield from _resolution(setting)
    yield from _sample_mass(setting)
    yield _temperature(setting)
    yield from _blank(setting)


def _nominal(setting: Setting) -> Finding:
    off = 100.0 * (setting.evaluation.value / setting.record.titrant.nominal - 1.0)
    limit = setting.limits.nominal_percent
    holds = abs(off) <= limit
    what = "titre" if setting.record.route == "mass-titre" else "concentration"
    says = (
        f"The {what} is {abs(off):.2f} % {'above' if off >= 0 else 'below'} nominal"
        f"{'' if holds else f', farther than the {limit:g} % allowed'}."
    )
    return Finding(
        name="nominal",
        verdict="holds" if holds else "fails",
        says=says,
        basis=setting.limits.basis("nominal_percent"),
        figure=off,
        limit=limit,
        unit="%",
        figure_text=f"{off:+.2f} %",
        limit_text=f"±{limit:g} %",
    )


def _burette_use(setting: Setting) -> Iterator[Finding]:
    """Tell how much of the burette was used: the least in all, the most in one filling."""
    capacity, limits = setting.record.burette.capacity, setting.limits
    totals, fillings = _delivered(setting)
    if capacity is None or not totals:
        return
    low, high = limits.burette_least_percent, limits.burette_most_percent
    least, most = 100.0 * min(totals) / capacity, 100.0 * max(fillings) / capacity
    range_text = f"{low:g} to {high:g} %"
    verdict: Verdict
    if least < low:
        verdict, figure, limit = "fails", least, low
        says = f"Only {least:.0f} % of the burette was used; use at least {low:g} %."
        basis = limits.basis("burette_least_percent")
    elif most > high:
        verdict, figure, limit = "fails", most, high
        says = f"{most:.0f} % of the burette was used; keep it at {high:g} % or less."
        basis = limits.basis("burette_most_percent")
    else:
        verdict, figure, limit = "holds", most, high
        says = f"Between {least:.0f} and {most:.0f} % of the burette was used."
        basis = limits.basis("burette_least_percent")
    if len(fillings) > len(totals):
        says += " It was refilled: its calibration counts once for every filling."
        verdict = "look" if verdict == "holds" else verdict
    yield Finding(
        name="burette use",
        verdict=verdict,
        says=says,
        basis=basis,
        figure=figure,
        limit=limit,
        unit="%",
        figure_text=f"{figure:.0f} %",
        limit_text=range_text,
    )


def _delivered(setting: Setting) -> tuple[list[float], list[float]]:
    """Return the volumes delivered in all and in each filling, mL as read."""
    totals, fillings = [], []
    for read, _ in setting.counting:
        parts = [end - start for start, end in read.segments]
        parts = parts or ([] if read.delivered is None else [read.delivered])
        if parts:
            totals.append(sum(parts))
            fillings += parts
    return totals, fillings


def _resolution(setting: Setting) -> Iterator[Finding]:
    """Tell whether the smallest volume and mass have four figures, and all decimals were typed."""
    known, multiple = setting.circumstances.resolution, setting.limits.resolution_multiple
    volume_step = (known.burette_mL if known else None) or _step(setting, mass=False)
    mass_step = (known.balance_g if known else None) or _step(setting, mass=True)
    totals, _ = _delivered(setting)
    masses = [one.mass_g for _, one in setting.counting if one.mass_g is not None]
    ratios = []
    if totals and volume_step:
        ratios.append((min(totals) / volume_step, f"{min(totals):g} mL", f"{volume_step:g} mL"))
    if masses and mass_step:
        ratios.append((min(masses) / mass_step, f"{min(masses):.6g} g", f"{mass_step:g} g"))
    if not ratios:
        return
    figure, smallest, step = min(ratios)
    # a ratio of two decimals may miss a whole multiple by the last bit
    holds = figure >= multiple * (1 - 1e-9)
    says = f"The smallest reading in question, {smallest}, is {figure:.0f} times the step of {step}"
    says += "." if holds else f"; at least {multiple:g} times is needed for four figures."
    says += "" if known else " The last digit typed is taken as the step."
    odd = _odd_decimals(setting)
    if odd:
        says += f" {odd}"
    yield Finding(
        name="resolution",
        verdict="holds" if holds and not odd else "fails",
        says=says,
        basis=setting.limits.basis("resolution_multiple"),
        figure=figure,
        limit=multiple,
        figure_text=f"{figure:.0f} ×",
        limit_text=f"at least {multiple:g} ×",
    )


def _typed(setting: Setting, *, mass: bool) -> list[tuple[str, str]]:
    """Return the typed masses, or burette readings, with their replicate's label."""
    starts = ("mass", "container_") if mass else ("burette", "delivered")
    return [
        (read.label, text)
        for read, _ in setting.counting
        for path, text in read.texts.items()
        if path.startswith(starts)
    ]


def _step(setting: Setting, *, mass: bool) -> float | None:
    """Return one unit of the last digit typed, the coarsest of the readings."""
    decimals = [decimals_of(text) for _, text in _typed(setting, mass=mass)]
    return 10.0 ** -min(decimals) if decimals else None


def _odd_decimals(setting: Setting) -> str:
    known = setting.circumstances.resolution
    wanted = [
        ("balance", known.balance_decimals if known else None, True),
        ("burette", known.burette_decimals if known else None, False),
    ]
    for instrument, decimals, mass in wanted:
        for label, text in _typed(setting, mass=mass):
            if decimals is not None and decimals_of(text) != decimals:
                return (
                    f"Replicate {label}: {text} has {decimals_of(text)} decimals, the "
                    f"{instrument} shows {decimals}."
                )
    return ""


def _sample_mass(setting: Setting) -> Iterator[Finding]:
    known = setting.circumstances.sample_mass
    masses = [one.mass_g for _, one in setting.counting if one.mass_g is not None]
    if known is None or not masses:
        return
    minima = [
        (known.lot_minimum_g, "the standard lot's certificate"),
        (known.balance_minimum_g, "the balance"),
    ]
    stated = [(minimum, whose) for minimum, whose in minima if minimum is not None]
    if not stated:
        return
    limit, whose = max(stated)
    smallest = min(masses)
    holds = smallest >= limit
    says = (
        f"The smallest mass, {smallest:.6g} g, is {'not below' if holds else 'below'} the minimum "
        f"of {whose}, {limit:g} g."
    )
    yield Finding(
        name="sample mass",
        verdict="holds" if holds else "fails",
        says=says,
        basis=f"minimum of {joined([whose for _, whose in stated])}",
        figure=smallest,
        limit=limit,
        unit="g",
        figure_text=f"{smallest:.6g} g",
        limit_text=f"at least {limit:g} g",
    )


def _temperature(setting: Setting) -> Finding:
    """Tell which temperature the volumes were reduced from, and whether water's density serves."""
    record, nominal = setting.record, setting.record.titrant.nominal
    read = [portion.temperature_C for portion in setting.evaluation.portions]
    farthest = max(read, key=lambda t: abs(t - 20.0))
    moved = farthest != 20.0 or (record.temperature is not None and record.temperature.u > 0)
    verdict: Verdict = "holds"
    if record.temperature is None and farthest == 20.0:
        verdict = "look"
        says = "No temperature was written; the volumes are taken as measured at exactly 20 °C."
    else:
        says = f"The volumes were brought to 20 °C from {min(read):g} to {max(read):g} °C."
    if moved and record.liquid_expansion is None and record.route == "mass-titre":
        says += " Water's expansion was used; titrants in other solvents expand more. State yours."
        verdict = "look"
    elif moved and record.liquid_expansion is None and nominal > _DILUTE_MOL_L:
        says += (
            f" Water's expansion was used for {nominal:g} mol/L; it serves dilute titrants, to "
            "about 0.1 mol/L. State the expansion of your solution."
        )
        verdict = "fails" if nominal >= _CONCENTRATED_MOL_L else "look"
    return Finding(
        name="temperature",
        verdict=verdict,
        says=says,
        basis="ISO 4787: volumes at 20 °C; water's density where the solution's is not stated",
        figure=farthest,
        limit=20.0,
        unit="Cel",
        figure_text=f"{farthest:g} °C",
        limit_text="reduced to 20 °C",
    )


def _blank(setting: Setting) -> Iterator[Finding]:
    """Tell whether reagents and visual overshoot are counted, and neither of them twice."""
    record, end_point = setting.record, setting.circumstances.end_point
    curved = any(read.curve is not None for read, _ in setting.counting)
    visual = end_point is not None and end_point.mode == "visual" and not curved
    kind = record.blank.kind if record.blank else None
    stated = joined(
        ([f"{kind} blank"] if kind else []) + (["excess"] if record.excess is not None else [])
    )
    verdict: Verdict
    if curved and (kind == "indicator" or record.excess is not None):
        verdict = "fails"
        says = "On a curve neither an indicator blank nor an excess applies; take it out."
    elif kind == "indicator" and record.excess is not None:
        verdict = "fails"
        says = "An indicator blank already holds the visual overshoot: it is counted twice."
    elif kind == "reagent" and any(one.holds_blank for one in setting.counting_curves):
        verdict = "look"
        says = _held_by_fit(setting)
    elif stated:
        verdict, says = "holds", f"You took off the {stated}."
        if kind == "zero":
            says = "The blank sets the zero: what the excess alone takes."
        if record.blank is not None:
            says += (
                " It counts without an uncertainty."
                if record.blank.volume.u == 0
                else f" Its uncertainty is {record.blank.volume.u:.2g} mL."
            )
    elif record.route == "mass-titre":
        return  # the cell is titrated dry before; what gets in later is the drift's finding
    elif needs := _blank_needed(setting):
        verdict, says = "look", needs
    elif visual:
        verdict = "look"
        says = "Neither a blank nor an excess is taken off a visual end point."
    elif end_point is None:
        return
    else:
        verdict, says = "holds", "No blank is taken off, and this end point needs none."
    volume = record.blank.volume.value if record.blank else None
    yield Finding(
        name="blank",
        verdict=verdict,
        says=says,
        basis="reagents and visual overshoot are each taken off once",
        figure=volume,
        unit="mL",
        figure_text="none" if volume is None else f"{volume:g} mL",
    )


def _held_by_fit(setting: Setting) -> str:
    """Return in words of which replicates the reagent blank was not taken off, and why."""
    held = [one.label for one in setting.counting_curves if one.holds_blank]
    rest = len(setting.counting) - len(held)
    says = (
        f"The reagent blank is not taken off {replicates_named(held)}: the model fit counts the "
        "carbonate of the flask's water itself, and it would be counted twice."
    )
    return says + (f" It is taken off the other {rest}." if rest else "")


def _blank_needed(setting: Setting) -> str | None:
    """Return why this titration needs a blank; silver with chromate needs one too."""
    end_point = setting.circumstances.end_point
    indicator = (end_point.indicator_used or end_point.indicator_expected) if end_point else None
    if setting.record.titrant.substance == "AgNO3" and "chromate" in (indicator or "").lower():
        return "Silver titrations with chromate need a blank: the red shows only in excess."
    return _NEEDS_BLANK.get(setting.record.titrant.substance)
