"""What was printed on a label, as the trail keeps it: enough to print the same label again."""

from collections.abc import Mapping
from dataclasses import asdict, dataclass
from typing import Any

from server.lab.label_hazards import SolutionHazards


@dataclass(frozen=True, slots=True)
class LabelValue:
    """A certified concentration on a label; ``valid_until`` is its last good day (ISO 8601)."""

    reported: str
    certificate: str
    valid_until: str


@dataclass(frozen=True, slots=True)
class LabelText:
    """What stands on one bottle's label.

    ``nominal`` in mol/L as text, ``prepared_on`` ISO 8601 or empty. ``reason`` says why the label
    is printed again; it is empty on the first one.
    """

    code: str
    titrant: str
    nominal: str
    lot: str
    bottle: int
    prepared_on: str
    laboratory: str
    address: str
    zone: str
    value: LabelValue | None = None
    hazards: SolutionHazards | None = None
    reason: str = ""

    def kept(self) -> dict[str, Any]:
        """Return the text as JSON-like values."""
        return asdict(self)


@dataclass(frozen=True, slots=True)
class LabelStock:
    """Onto what: the label stock's name, the first free place, the printer, the address in the QR.

    ``base_url`` is the laboratory's own address, ``dots_per_inch`` those of the printer.
    """

    stock: str
    base_url: str
    first_place: int = 1
    dots_per_inch: int = 300


def read_label_text(kept: Mapping[str, Any]) -> LabelText:
    """Return a label's text from what was kept of it."""
    value, hazards = kept["value"], kept["hazards"]
    return LabelText(
        **{
            **kept,
            "value": LabelValue(**value) if value else None,
            "hazards": SolutionHazards(
                **{
                    **hazards,
                    "pictograms": tuple(hazards["pictograms"]),
                    "statements": tuple(hazards["statements"]),
                }
            )
            if hazards
            else None,
        }
    )
