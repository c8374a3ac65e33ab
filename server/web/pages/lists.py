"""The lists as CSV files, with the filters of their pages."""

from fastapi import APIRouter, Response

from server.reports.lists import (
    instruments_csv,
    lots_csv,
    shelf_csv,
    standard_lots_csv,
    trail_csv,
)
from server.sheets.instruments_page import open_instruments
from server.sheets.lots_page import open_lots
from server.sheets.shelf_page import open_shelf
from server.sheets.stores_page import open_stores
from server.sheets.trail_list import open_trail_list
from server.web.pages.files import attachment
from server.web.visits import AtDesk, Visit

router = APIRouter()
_CSV = "text/csv; charset=utf-8"


@router.get("/shelf/list.csv")
def shelf(
    visit: AtDesk, words: str = "", state: str = "", titrant: str = "", place: str = ""
) -> Response:
    """Hand out the bottles on the shelf; a visitor gets those in force."""
    found = visit.read(open_shelf, words=words, state=state, titrant=titrant, place=place)
    return _answer(visit, shelf_csv(found), "shelf")


@router.get("/stores/standard-lots/list.csv")
def standard_lots(visit: AtDesk) -> Response:
    """Hand out the standard lots."""
    return _answer(visit, standard_lots_csv(visit.read(open_stores)), "standard-lots")


@router.get("/instruments/list.csv")
def instruments(visit: AtDesk) -> Response:
    """Hand out the instruments."""
    return _answer(visit, instruments_csv(visit.read(open_instruments).instruments), "instruments")


@router.get("/lots/list.csv")
def lots(visit: AtDesk, state: str = "", titrant: str = "") -> Response:
    """Hand out the titrant lots."""
    found = visit.read(open_lots, state=state, titrant=titrant)
    return _answer(visit, lots_csv(found), "lots")


@router.get("/trail/list.csv")
def trail(
    visit: AtDesk, person: str = "", thing: str = "", day: str = "", words: str = ""
) -> Response:
    """Hand out the trail, newest first."""
    found = visit.read(open_trail_list, person=person, thing=thing, day=day, words=words)
    return _answer(visit, trail_csv(found), "trail")


def _answer(visit: Visit, content: bytes, name: str) -> Response:
    return attachment(content, f"{name}-{visit.now:%Y-%m-%d}.csv", _CSV)
