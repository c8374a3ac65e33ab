"""What could be done to reach a smaller uncertainty: each change with what it costs."""

from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass, replace
from typing import Any

from server.evaluation.mass_window import MOST
from server.evaluation.planned_record import Situation
from server.metrology.quantity import Quantity, read_quantity

#: Minutes of work that a change costs: the laboratory's own estimate goes before these.
MINUTES: Mapping[str, int] = {
    "mass": 0, "temperature": 5, "replicate": 20, "burette": 180, "balance": 120, "standard": 0,
}  # fmt: skip
MOST_REPLICATES = 8
#: The group of changes that differ in the number of replicates, fewest first.
REPLICATES = "replicates"
#: What a change is assumed to reach: u of a burette after a gravimetric run, over its capacity; of
#: a thermometer in the titrant, in °C; of a balance's or a standard's u, over what it was.
BURETTE_RUN, THERMOMETER_C, HALF = 2e-4, 0.1, 0.5


@dataclass(frozen=True, slots=True)
class Change:
    """Something to do: its name, what it is, minutes of work, and whether it has to be bought.

    ``group`` holds alternatives of which one can be taken.
    """

    name: str
    group: str
    says: str
    minutes: int
    bought: bool
    apply: Callable[[Situation], Situation]


def changes_for(situation: Situation, *, minutes: Mapping[str, int] = MINUTES) -> list[Change]:
    """Return the changes that would make something smaller in this situation, cheapest first."""
    found = [
        *_mass(situation, minutes),
        *_temperature(situation, minutes),
        *_replicates(situation, minutes),
        *_balance(situation, minutes),
        *_burette(situation, minutes),
        *_standard(situation, minutes),
    ]
    return sorted(found, key=lambda one: (one.bought, one.minutes))


def _mass(situation: Situation, minutes: Mapping[str, int]) -> Iterator[Change]:
    if situation.materials.route == "weighed" and situation.use < MOST:
        yield Change(
            "mass", "mass",
            f"weigh at the upper end of the window, so that {100 * MOST:.0f} % of the burette is "
            "used",
            minutes["mass"], bought=False, apply=lambda one: replace(one, use=MOST),
        )  # fmt: skip


def _replicates(situation: Situation, minutes: Mapping[str, int]) -> Iterator[Change]:
    stated = situation.materials.repeatability or {}
    if stated.get("applies_to") == "mean":
        return
    for n in range(situation.replicates + 1, MOST_REPLICATES + 1):
        more = n - situation.replicates
        yield Change(
            f"{n} replicates", REPLICATES, f"titrate {n} replicates instead of "
            f"{situation.replicates}", more * minutes["replicate"], bought=False,
            apply=lambda one, n=n: replace(one, replicates=n),  # type: ignore[misc]
        )  # fmt: skip


def _temperature(situation: Situation, minutes: Mapping[str, int]) -> Iterator[Change]:
    bound = _quantity(situation.materials.thermometer, "reading", "Cel")
    if bound is None or bound.u <= THERMOMETER_C:
        return
    better = {"unit": "Cel", "u": str(THERMOMETER_C)}

    def apply(one: Situation) -> Situation:
        return _with(one, thermometer={**(one.materials.thermometer or {}), "reading": better})

    yield Change(
        "temperature", "temperature",
        f"read the titrant's temperature at the burette with a thermometer of u = {THERMOMETER_C} "
        "°C", minutes["temperature"], bought=False, apply=apply,
    )  # fmt: skip


def _burette(situation: Situation, minutes: Mapping[str, int]) -> Iterator[Change]:
    materials = situation.materials
    bound = _quantity(materials.burette, "delivery", "mL")
    reached = BURETTE_RUN * float(materials.burette["capacity"]["value"])
    if bound is None or bound.u <= reached:
        return
    better = {"unit": "mL", "u": f"{reached:.6f}"}

    def apply(one: Situation) -> Situation:
        return _with(one, burette={**one.materials.burette, "delivery": better})

    yield Change(
        "burette", "burette",
        f"calibrate the burette by weighing water, assumed to reach u = {1000 * reached:.1f} µL",
        minutes["burette"], bought=False, apply=apply,
    )  # fmt: skip


def _balance(situation: Situation, minutes: Mapping[str, int]) -> Iterator[Change]:
    materials = situation.materials
    bound = _quantity(materials.balance, "linearity", "g")
    if (
        materials.route != "weighed"
        or bound is None
        or (materials.balance or {}).get("error_table")
    ):
        return
    better = {"unit": "g", "u": f"{HALF * bound.u:.9f}"}

    def apply(one: Situation) -> Situation:
        return _with(one, balance={**(one.materials.balance or {}), "linearity": better})

    yield Change(
        "balance", "balance",
        "calibrate the balance with weights and use its error table, assumed to halve what it adds",
        minutes["balance"], bought=False, apply=apply,
    )  # fmt: skip


def _standard(situation: Situation, minutes: Mapping[str, int]) -> Iterator[Change]:
    bound = _quantity(situation.materials.standard, "mass_fraction", None)
    if bound is None or bound.value is None or bound.u == 0:
        return
    better = {"value": repr(bound.value), "u": f"{HALF * bound.u:.9f}"}

    def apply(one: Situation) -> Situation:
        return _with(one, standard={**(one.materials.standard or {}), "mass_fraction": better})

    yield Change(
        "standard", "standard",
        "take a standard lot whose mass fraction is known twice as well", minutes["standard"],
        bought=True, apply=apply,
    )  # fmt: skip


def _with(situation: Situation, **parts: Any) -> Situation:
    return replace(situation, materials=replace(situation.materials, **parts))


def _quantity(part: Mapping[str, Any] | None, key: str, unit: str | None) -> Quantity | None:
    stated = (part or {}).get(key)
    return None if stated is None else read_quantity(stated, key, unit=unit, needs_value=False)
