"""Substances: formula, density and drying of primary standards, storage of titrants, sources."""

from collections.abc import Mapping
from dataclasses import dataclass
from types import MappingProxyType

_HANDBOOK = "common handbook value, from memory"
#: Where drying and storage come from.
PRACTICE = "common practice, from memory; a certificate's or supplier's own statement goes first"


@dataclass(frozen=True, slots=True)
class Substance:
    """A substance by its key: name, formula as weighed, density in g/cm³, drying, storage.

    ``storage`` is how a solution of it is kept, empty for what is only weighed.
    """

    key: str
    name: str
    formula: str
    density_g_cm3: float | None = None
    density_source: str | None = None
    drying: str = ""
    storage: str = ""
    source: str = PRACTICE


def _standard(key: str, name: str, formula: str, density: float | None, drying: str) -> Substance:
    source = None if density is None else _HANDBOOK
    return Substance(key, name, formula, density, source, drying)


_LYE = (
    "Polyethylene bottle, or glass with a rubber stopper, never a ground-glass one; a soda-lime "
    "tube keeps carbon dioxide out."
)
_CLOSED = "Tightly closed bottle."
_DARK = "Brown bottle, in the dark, tightly closed."
_BOILED = "Made with water that was boiled and cooled; brown bottle, in the dark, tightly closed."
_PERMANGANATE = (
    "Made with boiled water and filtered through glass, never paper; brown bottle, in the dark."
)
_IODINE = "Brown bottle with a glass stopper, no rubber; in the dark and cool."
_EDTA = "Polyethylene bottle, tightly closed: glass gives off metal ions."
_ACETIC = "Brown bottle, tightly closed against moisture; concentration belongs to a temperature."

_ALL = (
    _standard("KHP", "potassium hydrogen phthalate", "C8H5KO4", 1.636, "120 °C, 2 h"),
    _standard("Na2CO3", "sodium carbonate", "Na2CO3", 2.54, "270 to 300 °C, 1 h"),
    _standard("TRIS", "tris(hydroxymethyl)aminomethane", "C4H11NO3", 1.33, "100 to 105 °C"),
    _standard("C7H6O2", "benzoic acid", "C7H6O2", 1.27, "desiccator"),
    _standard("H3NO3S", "sulfamic acid", "H3NO3S", 2.15, "vacuum desiccator"),
    _standard("KH(IO3)2", "potassium hydrogen iodate", "KH(IO3)2", None, "110 °C"),
    _standard("Na2B4O7", "borax decahydrate", "Na2B4O7.10H2O", 1.73, "never in an oven"),
    _standard("KIO3", "potassium iodate", "KIO3", 3.89, "120 to 130 °C"),
    _standard("K2Cr2O7", "potassium dichromate", "K2Cr2O7", 2.68, "140 to 150 °C"),
    _standard("Na2C2O4", "sodium oxalate", "Na2C2O4", 2.34, "105 to 110 °C, 1 to 2 h"),
    _standard("As2O3", "arsenic trioxide", "As2O3", 3.74, "105 °C, 1 h"),
    _standard("NaCl", "sodium chloride", "NaCl", 2.165, "500 to 600 °C"),
    _standard("KCl", "potassium chloride", "KCl", 1.984, "500 °C"),
    _standard("Zn", "zinc", "Zn", 7.13, "etched in dilute acid, rinsed"),
    _standard("ZnO", "zinc oxide", "ZnO", 5.61, "800 °C to constant mass"),
    _standard("CaCO3", "calcium carbonate", "CaCO3", 2.71, "110 °C, 2 h"),
    _standard("H2C2O4", "oxalic acid dihydrate", "C2H2O4.2H2O", 1.65, "never in an oven"),
    Substance("NaOH", "sodium hydroxide", "NaOH", storage=_LYE),
    Substance("KOH", "potassium hydroxide", "KOH", storage=_LYE),
    Substance("HCl", "hydrochloric acid", "HCl", storage=_CLOSED),
    Substance("H2SO4", "sulfuric acid", "H2SO4", storage=_CLOSED),
    Substance("HClO4", "perchloric acid", "HClO4", storage=_ACETIC),
    Substance("Na2S2O3", "sodium thiosulfate", "Na2S2O3.5H2O", 1.69, _HANDBOOK, storage=_BOILED),
    Substance("KMnO4", "potassium permanganate", "KMnO4", storage=_PERMANGANATE),
    Substance("AgNO3", "silver nitrate", "AgNO3", 4.35, _HANDBOOK, storage=_DARK),
    Substance("EDTA", "disodium edetate dihydrate", "C10H14N2Na2O8.2H2O", storage=_EDTA),
    Substance("I2", "iodine", "I2", storage=_IODINE),
    Substance("Ce(SO4)2", "cerium(IV) sulfate", "Ce(SO4)2", storage=_DARK),
)

#: Substances by key. Densities and drying are common handbook values, from memory: a certificate's
#: own statement goes before them.
SUBSTANCES: Mapping[str, Substance] = MappingProxyType({one.key: one for one in _ALL})


def name_of(key: str) -> str:
    """Return a substance's name, the key itself where the table does not know it."""
    known = SUBSTANCES.get(key)
    return known.name if known else key
