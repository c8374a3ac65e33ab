"""The planner."""

from typing import Annotated, Any

from fastapi import APIRouter, Depends, Request, Response

from server.lab.refusal import Unacceptable
from server.sheets.planner_page import PlanAsked, open_planner
from server.web.showing import problem_of, show
from server.web.visits import AtDesk

router = APIRouter()
_NUMBERS = ("replicates", "mass_g", "wanted_percent")


def plan_asked(request: Request) -> PlanAsked:
    """Return what is asked for in the address."""
    names = PlanAsked.__dataclass_fields__
    query = request.query_params
    return PlanAsked(**{name: query.get(name, "")[:60] for name in names})


Asked = Annotated[PlanAsked, Depends(plan_asked)]


@router.get("/planner")
def planner(visit: AtDesk, asked: Asked) -> Response:
    """Show what a standardization would give before the first weighing."""
    try:
        return _shown(visit, asked)
    except Unacceptable as refusal:
        typed = {name: text for name in _NUMBERS if (text := getattr(asked, name))}
        plain = PlanAsked(
            **{
                name: "" if name in _NUMBERS else getattr(asked, name)
                for name in PlanAsked.__dataclass_fields__
            }
        )
        return _shown(visit, plain, status=422, problem=problem_of(refusal), typed=typed)


def _shown(visit: AtDesk, asked: PlanAsked, **more: Any) -> Response:
    return show(
        visit,
        "planner/home.html",
        open_planner,
        asked,
        finish=lambda ready: ready.finish(),
        **more,
    )
