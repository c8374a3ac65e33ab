"""The laboratory's settings over the API, for a steward."""

from typing import Annotated

from fastapi import APIRouter, Depends, Response

from server.procedures.label_hazards import (
    ConfirmHazards,
    WithdrawHazards,
    confirm_hazards,
    withdraw_hazards,
)
from server.procedures.laboratory import ChangeSettings, change_settings
from server.sheets.laboratory import open_laboratory
from server.web.api.desk import AtApi, answer
from server.web.bodies import Given, body_of
from server.web.visits import AtDesk

router = APIRouter(tags=["laboratory"])
_SETTINGS = body_of(ChangeSettings)
_HAZARDS, _WITHDRAW = body_of(ConfirmHazards), body_of(WithdrawHazards)


@router.get("/laboratory")
def laboratory(visit: AtDesk) -> Response:
    """Tell the laboratory's settings."""
    return answer(visit.read(open_laboratory))


@router.post("/laboratory", openapi_extra=_SETTINGS.openapi)
def settings(desk: AtApi, given: Annotated[Given, Depends(_SETTINGS)]) -> Response:
    """Change the settings; what may be null stays as it is where it is not sent."""
    return answer({"revision": desk.act(change_settings, ChangeSettings(**given))})


@router.post("/laboratory/hazards", openapi_extra=_HAZARDS.openapi)
def hazards(desk: AtApi, given: Annotated[Given, Depends(_HAZARDS)]) -> Response:
    """Keep what labels of a solution show, as the responsible person confirmed it."""
    return answer({"revision": desk.act(confirm_hazards, ConfirmHazards(**given))})


@router.post("/laboratory/hazards/withdraw", openapi_extra=_WITHDRAW.openapi)
def withdraw(desk: AtApi, given: Annotated[Given, Depends(_WITHDRAW)]) -> Response:
    """Show no hazards on labels of a solution any more."""
    return answer({"revision": desk.act(withdraw_hazards, WithdrawHazards(**given))})
