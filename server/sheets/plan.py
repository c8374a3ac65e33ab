"""A plan as it is read: what a standardization would give before the first weighing."""

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class CountView:
    """The U to expect of the mean of n replicates; ``chosen`` for the number that is planned."""

    n: int
    U: str
    k: str
    chosen: bool


@dataclass(frozen=True, slots=True)
class ShareView:
    """A part of u²; ``shared`` ones do not shrink with more replicates."""

    source: str
    percent: str
    shared: bool


@dataclass(frozen=True, slots=True)
class WayView:
    """Something to do, what it costs and the U to expect of it."""

    says: str
    cost: str
    U: str
    reaches: bool


@dataclass(frozen=True, slots=True)
class PlanView:
    """A plan in words and pictures; ``problem`` says why there is none."""

    problem: str
    says: str
    window: str
    mass: str
    volume: str
    counts: tuple[CountView, ...]
    chart: str
    dominant: tuple[ShareView, ...]
    bars: str
    assumed: tuple[str, ...]
    wanted: str
    cheapest: WayView | None
    ways: tuple[WayView, ...]
