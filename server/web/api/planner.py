"""The planner over the API."""

from fastapi import APIRouter, Response

from server.sheets.planner_page import open_planner
from server.web.api.desk import answer
from server.web.pages.planner import Asked
from server.web.visits import AtDesk

router = APIRouter(tags=["stores"])


@router.get("/planner")
def planner(visit: AtDesk, asked: Asked) -> Response:
    """Tell what a standardization would give before the first weighing.

    Asked by ``recipe_id``, ``standard_lot_id``, ``balance_id``, ``burette_id``,
    ``thermometer_id``, ``room_id``, ``replicates``, ``mass_g`` and ``wanted_percent``; what is left
    out is proposed.
    """
    return answer(visit.read(open_planner, asked).finish())
