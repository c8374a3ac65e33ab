"""Units as D-SI writes them, and by which power of ten they become those of an instrument."""

from collections.abc import Mapping
from types import MappingProxyType

#: D-SI unit: the unit here and the power of ten to it. Temperature differences in kelvin are not
#: temperatures, so \\kelvin is left to a person.
_KNOWN: Mapping[str, tuple[str, int]] = MappingProxyType(
    {
        r"\kilogram": ("g", 3),
        r"\gram": ("g", 0),
        r"\milli\gram": ("g", -3),
        r"\micro\gram": ("g", -6),
        r"\litre": ("mL", 3),
        r"\milli\litre": ("mL", 0),
        r"\micro\litre": ("mL", -3),
        r"\centi\metre\tothe{3}": ("mL", 0),
        r"\degreecelsius": ("Cel", 0),
        r"\milli\volt": ("mV", 0),
        r"\volt": ("mV", 3),
        r"\one": ("1", 0),
        r"\percent": ("%", 0),
    }
)


def unit_of(text: str) -> tuple[str, int] | None:
    """Return the unit here and the power of ten to it, or None where D-SI's is not known here."""
    return _KNOWN.get("".join(text.split()))
