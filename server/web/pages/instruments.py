"""Instruments and their calibrations."""

from typing import Any

from fastapi import APIRouter, Response

from server.procedures.instruments import record_calibration, register_instrument
from server.sheets.instruments_page import open_instrument, open_instruments
from server.web.forms.instruments import read_calibration_form, read_instrument
from server.web.forms.posts import Again, Posted
from server.web.pages.keeping import open_for_keeper
from server.web.showing import show
from server.web.visits import AtDesk

router = APIRouter()
_NEW, _CALIBRATION = "instruments/new.html", "instruments/calibration_new.html"


def _open_calibration(session: Any, instrument_id: str, **who: Any) -> Any:
    open_for_keeper(session, **who)
    return open_instrument(session, instrument_id, **who)


@router.get("/instruments")
def home(visit: AtDesk) -> Response:
    """Show all instruments with the state of their calibrations."""
    return show(visit, "instruments/home.html", open_instruments)


@router.get("/instruments/new")
def instrument_form(visit: AtDesk) -> Response:
    """Show the form for a new instrument."""
    return show(visit, _NEW, open_for_keeper)


@router.post("/instruments/new")
def register(post: Posted) -> Response:
    """Register an instrument."""

    def work() -> str:
        made = post.act(register_instrument, read_instrument(post.form))
        return f"/instruments/{made}"

    return post.answer(work, again=Again(_NEW, open_for_keeper))


@router.get("/instruments/{instrument_id}")
def instrument(visit: AtDesk, instrument_id: str) -> Response:
    """Show one instrument with its calibrations."""
    return show(visit, "instruments/instrument.html", open_instrument, instrument_id)


@router.get("/instruments/{instrument_id}/calibrations/new")
def calibration_form(visit: AtDesk, instrument_id: str) -> Response:
    """Show the form for a calibration."""
    return show(visit, _CALIBRATION, _open_calibration, instrument_id)


@router.post("/instruments/{instrument_id}/calibrations/new")
def record(post: Posted, instrument_id: str) -> Response:
    """Record a calibration; it serves from now on."""

    def work() -> str:
        kind = post.visit.read(open_instrument, instrument_id).kind
        post.act(record_calibration, read_calibration_form(post.form, instrument_id, kind))
        return f"/instruments/{instrument_id}"

    return post.answer(work, again=Again(_CALIBRATION, _open_calibration, (instrument_id,)))
