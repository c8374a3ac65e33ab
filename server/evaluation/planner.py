"""Planning before the first weighing: how much to weigh, the U to expect, what would shrink it."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from itertools import combinations

from server.evaluation import result as rows
from server.evaluation.assembly import SheetMaterials
from server.evaluation.circumstances import Circumstances, Pooled
from server.evaluation.mass_window import LEAST, MOST
from server.evaluation.planned_changes import MINUTES, REPLICATES, Change, changes_for
from server.evaluation.planned_record import (
    Planned,
    Situation,
    capacity_mL,
    evaluate_planned,
)
from server.lab.refusal import Unacceptable

COUNTS = range(3, 9)
#: The part of the burette that a plan takes where nobody says how much will be weighed: in the
#: upper half of the window, for the burette's share of U falls with the volume.
AIM = 0.80
_DOMINANT_LINES = 4


@dataclass(frozen=True, slots=True)
class PlannedCount:
    """The expanded uncertainty to expect of the mean of n replicates, in percent of it."""

    n: int
    U_percent: float
    k: float


@dataclass(frozen=True, slots=True)
class Share:
    """A source's part of u² in percent; ``shared`` ones do not shrink with more replicates."""

    source: str
    percent: float
    shared: bool


@dataclass(frozen=True, slots=True)
class Way:
    """Changes to make together: what they cost, and the U in percent to expect of them."""

    changes: tuple[str, ...]
    says: str
    minutes: int
    bought: bool
    U_percent: float
    reaches: bool


@dataclass(frozen=True, slots=True)
class Plan:
    """A plan of one standardization.

    ``window_g`` is the mass of standard that delivers 60 to 90 % of the burette (None where
    nothing is weighed), ``mass_g`` and ``volume_mL`` what the figures assume. ``ways`` are the
    single changes, cheapest first; ``cheapest`` the cheapest set of them that reaches the wanted
    U, None where none does or none is needed. ``assumed`` says in words what was taken for granted.
    """

    window_g: tuple[float, float] | None
    mass_g: float | None
    volume_mL: float
    replicates: int
    counts: tuple[PlannedCount, ...]
    dominant: tuple[Share, ...]
    assumed: tuple[str, ...]
    wanted_percent: float | None
    reached: bool | None
    ways: tuple[Way, ...]
    cheapest: Way | None
    says: str


def plan(
    materials: SheetMaterials,
    *,
    replicates: int | None = None,
    mass_g: float | None = None,
    pooled: Pooled | None = None,
    spread_limit_percent: float = 0.2,
    wanted_percent: float | None = None,
    least_g: float | None = None,
    minutes: Mapping[str, int] = MINUTES,
) -> Plan:
    """Return the plan of a standardization from its recipe, lot and instruments.

    The record is built as the bench would build it and evaluated by the current calculation, every
    replicate as nominal. ``mass_g`` is what will be weighed (None: four fifths of the burette);
    the repeatability is the recipe's, else ``pooled``, else the limit of spread. ``least_g`` is the
    smallest sample of lot and balance; ``wanted_percent`` a wanted U over c.

    Raises:
        Unacceptable: the materials lack what the route needs.
    """
    start, assumed = _situation(
        materials, replicates=replicates, pooled=pooled, spread_limit_percent=spread_limit_percent
    )
    found = evaluate_planned(start)
    window = None
    if found.mass_g is not None:
        window = (found.mass_g * LEAST / start.use, found.mass_g * MOST / start.use)
        if mass_g is not None:
            start = replace(start, use=_use_of(mass_g, start, found))
            found = evaluate_planned(start)
        assumed += _about_mass(window, found.mass_g or 0.0, least_g)
    ways, cheapest = _ways(start, found, wanted_percent, minutes)
    reached = None if wanted_percent is None else found.U_percent <= wanted_percent
    return Plan(
        window_g=window,
        mass_g=found.mass_g,
        volume_mL=found.volume_mL,
        replicates=start.replicates,
        counts=tuple(_count(start, n) for n in COUNTS),
        dominant=_dominant(found),
        assumed=assumed,
        wanted_percent=wanted_percent,
        reached=reached,
        ways=ways,
        cheapest=cheapest,
        says=_says(found, wanted_percent, cheapest, ways),
    )


def _situation(
    materials: SheetMaterials,
    *,
    replicates: int | None,
    pooled: Pooled | None,
    spread_limit_percent: float,
) -> tuple[Situation, tuple[str, ...]]:
    """Return where the plan starts, and what it takes for granted of the spread."""
    n = materials.replicates_wanted if replicates is None else replicates
    words = "The liquids at 20 °C, the air at 20 °C, 1013 hPa and 50 %."
    if materials.repeatability is not None:
        return Situation(materials, Circumstances(), n, AIM), (words,)
    if pooled is not None:
        said = f"Repeatability: {pooled.source}, {100 * pooled.relative_s:.3g} % for one replicate."
        return Situation(materials, Circumstances(pooled=pooled), n, AIM), (words, said)
    limit = Pooled(relative_s=spread_limit_percent / 100.0, source="the limit of spread")
    said = (
        f"Nothing tells the repeatability yet: it is taken at the limit of spread, "
        f"{spread_limit_percent:g} % for one replicate."
    )
    return Situation(materials, Circumstances(pooled=limit), n, AIM), (words, said)


def _use_of(mass_g: float, start: Situation, found: Planned) -> float:
    """Return the part of the burette that a mass needs.

    Raises:
        Unacceptable: it is not above zero, or needs more than the burette holds.
    """
    use = start.use * mass_g / (found.mass_g or 1.0)
    if mass_g <= 0:
        raise Unacceptable("The mass must be above zero.", field="mass", example="0.4")
    if use > 1.0:
        capacity = capacity_mL(start.materials)
        says = (
            f"{mass_g:g} g would need {use * capacity:.1f} mL; the burette holds {capacity:g} mL."
        )
        raise Unacceptable(says, field="mass", example=f"{(found.mass_g or 0.4):.4f}")
    return use


def _about_mass(
    window: tuple[float, float], mass_g: float, least_g: float | None
) -> tuple[str, ...]:
    found: tuple[str, ...] = ()
    slack = 1e-9
    if not window[0] * (1 - slack) <= mass_g <= window[1] * (1 + slack):
        found += (f"{mass_g:.4f} g lie outside the window.",)
    if least_g is not None and mass_g < least_g:
        least = f"{mass_g:.4f} g are less than the smallest sample of lot and balance"
        found += (f"{least}, {least_g:g} g: take a larger burette or make the standard up.",)
    return found


def _count(start: Situation, n: int) -> PlannedCount:
    found = evaluate_planned(replace(start, replicates=n))
    return PlannedCount(n, found.U_percent, found.evaluation.k)


def _dominant(found: Planned) -> tuple[Share, ...]:
    lines = rows.budget_rows(found.evaluation)
    shares = [Share(one["source"], one["share_percent"], one["shared"]) for one in lines]
    largest = sorted(shares, key=lambda one: -one.percent)
    return tuple(one for one in largest[:_DOMINANT_LINES] if one.percent >= 1.0)


def _ways(
    start: Situation, found: Planned, wanted: float | None, minutes: Mapping[str, int]
) -> tuple[tuple[Way, ...], Way | None]:
    """Return each change alone, and the cheapest set of changes that reaches the wanted U."""
    if wanted is None or found.U_percent <= wanted:
        return (), None
    changes = changes_for(start, minutes=minutes)
    single = tuple(_way(start, (one,), wanted) for one in changes)
    return single, _cheapest(start, changes, wanted)


def _cheapest(start: Situation, changes: Sequence[Change], wanted: float) -> Way | None:
    """Return the cheapest set of changes that reaches the wanted U, None where none does.

    Every change makes U smaller, so a set that does not reach it with the most replicates does not
    reach it with fewer.
    """
    more = [one for one in changes if one.group == REPLICATES]
    others = [one for one in changes if one.group != REPLICATES]
    sets = [chosen for n in range(len(others) + 1) for chosen in combinations(others, n)]
    best: tuple[tuple[int, int, int], Way] | None = None
    for chosen in sorted(sets, key=_cost):
        if best is not None and _cost(chosen) >= best[0]:
            break
        if not _way(start, (*chosen, *more[-1:]), wanted).reaches:
            continue
        tried = [chosen, *((*chosen, one) for one in more)]
        way = next(way for one in tried if (way := _way(start, one, wanted)).reaches)
        cost = _cost(tried[next(i for i, one in enumerate(tried) if _names(one) == way.changes)])
        if best is None or cost < best[0]:
            best = (cost, way)
    return None if best is None else best[1]


def _names(changes: Sequence[Change]) -> tuple[str, ...]:
    return tuple(one.name for one in changes)


def _cost(changes: Sequence[Change]) -> tuple[int, int, int]:
    bought = sum(one.bought for one in changes)
    return bought, sum(one.minutes for one in changes), len(changes)


def _way(start: Situation, changes: Sequence[Change], wanted: float) -> Way:
    situation = start
    for one in changes:
        situation = one.apply(situation)
    U = evaluate_planned(situation).U_percent
    return Way(
        changes=_names(changes),
        says="; ".join(one.says for one in changes),
        minutes=sum(one.minutes for one in changes),
        bought=any(one.bought for one in changes),
        U_percent=U,
        reaches=wanted >= U,
    )


def _says(found: Planned, wanted: float | None, cheapest: Way | None, ways: Sequence[Way]) -> str:
    expected = f"U = {found.U_percent:.3f} % is to be expected"
    if wanted is None:
        return f"{expected}."
    if found.U_percent <= wanted:
        return f"{expected}, within the wanted {wanted:g} %."
    if cheapest is not None:
        return f"{expected}. For {wanted:g} %: {cheapest.says}."
    best = min((one.U_percent for one in ways), default=found.U_percent)
    return (
        f"{expected}. Nothing known here reaches {wanted:g} %; the best single change gives "
        f"{best:.3f} %."
    )
