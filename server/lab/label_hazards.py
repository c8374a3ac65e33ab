"""Hazards on labels: only what the laboratory's responsible person confirmed for a solution."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from decimal import Decimal, InvalidOperation
from typing import Any

from server.lab.refusal import Unacceptable

PICTOGRAMS: Mapping[str, str] = {
    "GHS01": "exploding bomb",
    "GHS02": "flame",
    "GHS03": "flame over circle",
    "GHS04": "gas cylinder",
    "GHS05": "corrosion",
    "GHS06": "skull and crossbones",
    "GHS07": "exclamation mark",
    "GHS08": "health hazard",
    "GHS09": "environment",
}
SIGNAL_WORDS = ("", "Danger", "Warning")


@dataclass(frozen=True, slots=True)
class SolutionHazards:
    """What labels of one solution may show, and who confirmed it on which day (ISO 8601).

    A solution is a titrant at a nominal concentration (mol/L, as text) in a medium: another
    strength is another hazard.
    """

    titrant: str
    nominal: str
    medium: str
    pictograms: tuple[str, ...]
    signal_word: str
    statements: tuple[str, ...]
    confirmed_by: str
    confirmed_on: str

    def is_of(self, titrant: str, nominal: str, medium: str) -> bool:
        """Say whether this was confirmed for a solution; 0.10 mol/L is 0.1 mol/L."""
        return (self.titrant, self.medium) == (titrant, medium) and (
            _amount(self.nominal) == _amount(nominal)
        )


def check_hazards(pictograms: Sequence[str], signal_word: str, *, field: str = "") -> None:
    """Refuse a pictogram or signal word that is none; ``field`` stands before the field's name.

    Raises:
        Unacceptable: a key that is none of the nine of the GHS, a word that is none of its two.
    """
    for one in pictograms:
        if one not in PICTOGRAMS:
            says = f"“{one[:40]}” is no pictogram; it is one of {', '.join(PICTOGRAMS)}."
            raise Unacceptable(says, field=f"{field}pictograms", example="GHS05")
    if signal_word not in SIGNAL_WORDS:
        says = f"“{signal_word[:40]}” is no signal word."
        raise Unacceptable(says, field=f"{field}signal_word", example="Danger")


def kept_hazards(settings: Mapping[str, Any]) -> tuple[SolutionHazards, ...]:
    """Return what the laboratory's settings hold of confirmed hazards."""
    return tuple(
        SolutionHazards(
            **{
                **one,
                "pictograms": tuple(one["pictograms"]),
                "statements": tuple(one["statements"]),
            }
        )
        for one in settings.get("label_hazards") or ()
    )


def hazards_of(
    settings: Mapping[str, Any], titrant: str, nominal: str, medium: str
) -> SolutionHazards | None:
    """Return what was confirmed for a solution, or None."""
    found = (one for one in kept_hazards(settings) if one.is_of(titrant, nominal, medium))
    return next(found, None)


def _amount(text: str) -> Decimal | str:
    try:
        return Decimal(text)
    except InvalidOperation:
        return text
