"""Standard lots and recipes over the API."""

from typing import Annotated

from fastapi import APIRouter, Depends, Response

from server.procedures.stores import (
    ReceiveStandardLot,
    WriteRecipe,
    receive_standard_lot,
    write_recipe,
)
from server.sheets.standard_lot_page import open_standard_lot
from server.sheets.stores_page import open_recipe, open_stores
from server.web.api.desk import AtApi, answer, made
from server.web.bodies import Given, body_of
from server.web.visits import AtDesk

router = APIRouter(tags=["stores"])
_RECEIVE, _WRITE = body_of(ReceiveStandardLot), body_of(WriteRecipe)


@router.get("/stores")
def stores(visit: AtDesk) -> Response:
    """List standard lots and recipes."""
    return answer(visit.read(open_stores))


@router.post("/standard-lots", openapi_extra=_RECEIVE.openapi, status_code=201)
def receive(desk: AtApi, given: Annotated[Given, Depends(_RECEIVE)]) -> Response:
    """Receive a standard lot."""
    made_id = desk.act(receive_standard_lot, ReceiveStandardLot(**given))
    return made(f"/api/standard-lots/{made_id}", id=made_id)


@router.get("/standard-lots/{standard_lot_id}")
def standard_lot(visit: AtDesk, standard_lot_id: str) -> Response:
    """Tell a standard lot."""
    return answer(visit.read(open_standard_lot, standard_lot_id))


@router.post("/recipes", openapi_extra=_WRITE.openapi, status_code=201)
def write(desk: AtApi, given: Annotated[Given, Depends(_WRITE)]) -> Response:
    """Write a recipe, or its next version."""
    made_id = desk.act(write_recipe, WriteRecipe(**given))
    return made(f"/api/recipes/{made_id}", id=made_id)


@router.get("/recipes/{recipe_id}")
def recipe(visit: AtDesk, recipe_id: str) -> Response:
    """Tell one version of a recipe."""
    return answer(visit.read(open_recipe, recipe_id))
