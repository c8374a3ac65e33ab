"""Instruments: the list, one of them, registering and describing it, and its log."""

from fastapi import APIRouter, Response

from server.procedures.instrument_log import set_limits, strike_check, write_check
from server.procedures.instruments import describe_instrument, register_instrument
from server.sheets.instruments_page import open_instrument, open_instruments
from server.web.forms.instruments import (
    read_check,
    read_description,
    read_instrument,
    read_limits,
    read_strike,
)
from server.web.forms.posts import Again, Posted
from server.web.pages.keeping import open_for_keeper
from server.web.showing import show
from server.web.visits import AtDesk

router = APIRouter()
_NEW, _ONE = "instruments/new.html", "instruments/instrument.html"


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
    """Show one instrument with its calibrations and the checks between them."""
    return show(visit, _ONE, open_instrument, instrument_id)


@router.post("/instruments/{instrument_id}/identity")
def describe(post: Posted, instrument_id: str) -> Response:
    """Describe an instrument anew, with the reason."""

    def work() -> str:
        post.act(describe_instrument, read_description(post.form, instrument_id))
        return f"/instruments/{instrument_id}"

    return post.answer(work, again=_again(instrument_id))


@router.post("/instruments/{instrument_id}/limits")
def limits(post: Posted, instrument_id: str) -> Response:
    """Set the limits of a check."""

    def work() -> str:
        kind = post.visit.read(open_instrument, instrument_id).kind
        post.act(set_limits, read_limits(post.form, instrument_id, kind))
        return f"/instruments/{instrument_id}#checks"

    return post.answer(work, again=_again(instrument_id))


@router.post("/instruments/{instrument_id}/checks")
def check(post: Posted, instrument_id: str) -> Response:
    """Write a check down, whatever it says."""

    def work() -> str:
        post.act(write_check, read_check(post.form, instrument_id))
        return f"/instruments/{instrument_id}#checks"

    return post.answer(work, again=_again(instrument_id))


@router.post("/instruments/{instrument_id}/strike")
def strike(post: Posted, instrument_id: str) -> Response:
    """Strike a line of the log through."""

    def work() -> str:
        post.act(strike_check, read_strike(post.form, instrument_id))
        return f"/instruments/{instrument_id}#checks"

    return post.answer(work, again=_again(instrument_id))


def _again(instrument_id: str) -> Again:
    return Again(_ONE, open_instrument, (instrument_id,))
