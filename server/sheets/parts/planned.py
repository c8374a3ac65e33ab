"""From a plan's figures to what a person reads of it."""

from dataclasses import dataclass

from sqlalchemy.orm import Session

from server.drawing.bars import Bar, budget_bars
from server.drawing.planned import Expected, expected_uncertainty
from server.evaluation.assembly import SheetMaterials
from server.evaluation.circumstances import Limits, Pooled
from server.evaluation.from_sheet import limits_of, materials_on
from server.evaluation.planned_record import capacity_mL
from server.evaluation.planner import Plan, Way, plan
from server.evaluation.pooled_history import pooled_history
from server.lab.recipe import RecipeDocument
from server.lab.refusal import Unacceptable
from server.lab.sheet_facts import BALANCE, BURETTE
from server.metrology.rounding import printed_k, significant
from server.records.queries.list_spreads import spreads_of_recipe
from server.records.queries.load_papers import load_laboratory_fact
from server.sheets.parts.offered import Materials
from server.sheets.parts.telling import count_words
from server.sheets.plan import CountView, PlanView, ShareView, WayView


@dataclass(frozen=True, slots=True)
class ToPlan:
    """All that a plan is made of: read, and waiting for its arithmetic.

    ``lacks`` says in words what is not there; ``least_g`` is the smallest sample.
    """

    lacks: str
    materials: SheetMaterials | None
    pooled: Pooled | None
    limits: Limits
    least_g: float | None
    standard: str
    burette: str
    replicates: int | None = None
    mass_g: float | None = None
    wanted_percent: float | None = None


def planned_with(
    session: Session, picked: Materials, recipe: RecipeDocument, *, recipe_name: str
) -> ToPlan:
    """Return what a plan with some materials is made of; nothing is computed yet."""
    by_kind = {one.kind: one for one in picked.instruments}
    lacking = [kind for kind in (BALANCE, BURETTE) if kind not in by_kind]
    if picked.standard_lot is None:
        lacking.insert(0, f"lot of {recipe.standard}")
    lacks = f"There is no {' and no '.join(lacking)} that could be used now." if lacking else ""
    if recipe.route != "weighed":
        lacks = "Only recipes that weigh a standard are planned here yet."
    laboratory = load_laboratory_fact(session)
    balance, burette = by_kind.get(BALANCE), by_kind.get(BURETTE)
    least = [picked.standard_lot.document.get("minimum_sample_g")] if picked.standard_lot else []
    if balance is not None:
        least += [balance.document.get("minimum_g") or balance.identity.get("minimum_g")]
    return ToPlan(
        lacks=lacks,
        materials=(
            None if lacks else materials_on(recipe, picked.standard_lot, picked.instruments)
        ),
        pooled=pooled_history(spreads_of_recipe(session, recipe_name)),
        limits=limits_of(laboratory.settings.get("limits") or {}, recipe.limits),
        least_g=max((float(one) for one in least if one), default=None),
        standard=recipe.standard,
        burette=burette.name if burette else "",
    )


def plan_view(asked: ToPlan) -> PlanView:
    """Return the plan in words and pictures; where nothing can be planned it says why.

    Raises:
        Unacceptable: the mass asked for is none that this burette can titrate.
    """
    if asked.materials is None:
        return _none(asked.lacks)
    try:
        found = plan(
            asked.materials,
            replicates=asked.replicates,
            mass_g=asked.mass_g,
            pooled=asked.pooled,
            spread_limit_percent=asked.limits.spread_percent,
            wanted_percent=asked.wanted_percent,
            least_g=asked.least_g,
        )
    except Unacceptable as problem:
        if problem.field == "mass":
            raise
        return _none(problem.says)
    return _view(asked, found)


def _view(asked: ToPlan, found: Plan) -> PlanView:
    points = [Expected(one.n, one.U_percent, one.n == found.replicates) for one in found.counts]
    bars = [Bar(one.source, one.percent, one.shared) for one in found.dominant]
    return PlanView(
        problem="",
        says=found.says,
        window=_window(asked, found),
        mass=f"{significant(found.mass_g, 4)} g" if found.mass_g is not None else "",
        volume=f"{found.volume_mL:.2f} mL",
        counts=tuple(
            CountView(one.n, f"{one.U_percent:.3f} %", printed_k(one.k), one.n == found.replicates)
            for one in found.counts
        ),
        chart=expected_uncertainty(points, wanted_percent=found.wanted_percent),
        dominant=tuple(
            ShareView(one.source, f"{one.percent:.0f} %", one.shared) for one in found.dominant
        ),
        bars=budget_bars(bars),
        assumed=found.assumed,
        wanted="" if found.wanted_percent is None else f"{found.wanted_percent:g} %",
        cheapest=_way(found.cheapest) if found.cheapest else None,
        ways=tuple(_way(one) for one in found.ways),
    )


def _window(asked: ToPlan, found: Plan) -> str:
    if found.window_g is None:
        return ""
    low, high = (significant(one, 3) for one in found.window_g)
    capacity = f"{capacity_mL(asked.materials):g} mL" if asked.materials else ""
    return f"{low} to {high} g of {asked.standard} for 60 to 90 % of {asked.burette} ({capacity})"


def _way(way: Way) -> WayView:
    cost = "to be bought" if way.bought else ""
    if way.minutes or not way.bought:
        work = _minutes(way.minutes)
        cost = f"{cost}, {work}" if cost else work
    return WayView(way.says, cost, f"{way.U_percent:.3f} %", way.reaches)


def _minutes(minutes: int) -> str:
    if not minutes:
        return "no more work"
    hours, rest = divmod(minutes, 60)
    parts = [count_words(hours, "hour")] if hours else []
    parts += [count_words(rest, "minute")] if rest else []
    return "about " + " ".join(parts)


def _none(why: str) -> PlanView:
    return PlanView(why, "", "", "", "", (), "", (), "", (), "", None, ())
