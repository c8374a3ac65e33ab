"""The planner as it is read: what is picked, and the plan."""

from dataclasses import dataclass

from server.sheets.bench import Choice
from server.sheets.plan import PlanView


@dataclass(frozen=True, slots=True)
class PickList:
    """Things to pick from, by the form's field; ``chosen`` is the one that the plan uses."""

    field: str
    label: str
    choices: tuple[Choice, ...]
    chosen: str


@dataclass(frozen=True, slots=True)
class PlannerPage:
    """The planner: what is picked, what was typed, and the plan."""

    picks: tuple[PickList, ...]
    replicates: str
    mass_g: str
    wanted_percent: str
    plan: PlanView
