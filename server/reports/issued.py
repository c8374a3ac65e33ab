"""A certificate as it leaves the laboratory: the issued document, its state, its anchor."""

import json
from collections.abc import Mapping
from dataclasses import dataclass, field
from datetime import datetime
from typing import Any

from server.lab.canonical import canonical
from server.lab.own_site import PAPERS
from server.lab.states import STANDING


@dataclass(frozen=True, slots=True)
class Anchor:
    """The act of the trail that a certificate is anchored to: its number and hash."""

    seq: int
    hash: str


@dataclass(frozen=True, slots=True)
class Issued:
    """An issued certificate as of an instant.

    ``document`` is what ``server.lab.certificate_document`` built, ``holds`` says whether its text
    is the one that was issued, ``signatures_hold`` the same of each signature in its order.
    ``snapshot`` is the kept text of its evaluation, ``previous`` the document it replaces. ``url``
    is the address where its state today can be asked. ``state_says`` adds to a state why and since
    when, in words. ``paper`` is what the laboratory prints on.
    """

    document: Mapping[str, Any] = field(repr=False)
    document_digest: str
    state: str
    replaced_by: str | None
    anchor: Anchor
    holds: bool
    as_of: datetime
    signatures_hold: tuple[bool, ...] = ()
    snapshot: str | None = field(default=None, repr=False)
    previous: Mapping[str, Any] | None = field(default=None, repr=False)
    url: str | None = None
    state_says: str = ""
    paper: str = PAPERS[0]

    @property
    def number(self) -> str:
        """The certificate's number."""
        return str(self.document["number"])

    @property
    def stands(self) -> bool:
        """Whether it is neither replaced nor pulled."""
        return self.state == STANDING

    @property
    def text(self) -> str:
        """The document's canonical text: the same bytes as are kept while it holds."""
        return canonical(self.document)

    def evaluation_document(self) -> dict[str, Any] | None:
        """Return record, trials and seed of the evaluation that it rests on, or None."""
        if self.snapshot is None:
            return None
        held = json.loads(self.snapshot)
        return {key: held[key] for key in ("record", "trials", "seed", "calculation")}


def issued_from(
    found: Mapping[str, Any],
    *,
    signatures_hold: tuple[bool, ...] = (),
    snapshot: str | None = None,
    previous: Mapping[str, Any] | None = None,
    url: str | None = None,
    paper: str = PAPERS[0],
) -> Issued:
    """Return what ``open_certificate_document`` found, ready to leave the laboratory."""
    return Issued(
        document=found["document"],
        document_digest=found["document_digest"],
        state=found["state"],
        replaced_by=found["replaced_by"],
        anchor=Anchor(**found["trail"]),
        holds=found["document_holds"],
        as_of=datetime.fromisoformat(found["as_of"]),
        signatures_hold=signatures_hold,
        snapshot=snapshot,
        previous=previous,
        url=url,
        state_says=found["state_says"],
        paper=paper,
    )
