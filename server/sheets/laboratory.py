"""The laboratory's settings as the steward reads them."""

from dataclasses import dataclass
from datetime import datetime

from sqlalchemy.orm import Session

from server.lab.actor import Actor
from server.lab.label_hazards import PICTOGRAMS, SIGNAL_WORDS, SolutionHazards, kept_hazards
from server.lab.own_site import PAPERS
from server.lab.roles import Act
from server.records.queries.loading import laboratory_row
from server.sheets.parts.doors import need_reader

_PAPERS = {"a4": "A4", "us-letter": "Letter"}


@dataclass(frozen=True, slots=True)
class LaboratoryPage:
    """The settings page. ``pictograms`` are keys with their words."""

    laboratory: str
    address: str
    zone: str
    own_signature: bool
    shelf_open: bool
    country: str
    base_url: str
    label_value: bool
    paper: str
    papers: tuple[tuple[str, str], ...]
    hazards: tuple[SolutionHazards, ...]
    pictograms: tuple[tuple[str, str], ...]
    signal_words: tuple[tuple[str, str], ...]
    revision: int


def open_laboratory(session: Session, *, actor: Actor | None, now: datetime) -> LaboratoryPage:
    """Return the laboratory's settings, for the steward.

    Raises:
        NotSignedIn: a visitor.
        NotAllowed: somebody else than a steward.
    """
    del now
    need_reader(actor).need(Act.ADMINISTER)
    row = laboratory_row(session)
    settings = row.settings
    return LaboratoryPage(
        laboratory=row.name,
        address=row.address,
        zone=row.zone,
        own_signature=row.own_signature,
        shelf_open=bool(settings.get("shelf_open", True)),
        country=str(settings.get("country") or ""),
        base_url=str(settings.get("base_url") or ""),
        label_value=bool(settings.get("label_value")),
        paper=str(settings.get("paper") or PAPERS[0]),
        papers=tuple((one, _PAPERS[one]) for one in PAPERS),
        hazards=kept_hazards(settings),
        pictograms=tuple(PICTOGRAMS.items()),
        signal_words=tuple((one, one or "none") for one in SIGNAL_WORDS),
        revision=row.revision,
    )
