"""What this program is."""

from dataclasses import dataclass

from fastapi import APIRouter, Response

from server.web.showing import page_opener, show
from server.web.visits import AtDesk

router = APIRouter()


@dataclass(frozen=True, slots=True)
class AboutPage:
    """The release of the program; a visitor is not told."""

    version: str


@router.get("/about")
def about(visit: AtDesk) -> Response:
    """Show cautions, words and how the record is kept."""
    version = visit.parts.version if visit.actor else ""
    return show(visit, "about.html", page_opener(AboutPage(version)))
