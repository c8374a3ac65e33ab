"""Cautions about substances, shown before the work; they replace no safety data sheet.

The hazard statements are those that suppliers commonly give under the Globally Harmonized System,
from memory: they are a fallback, and the supplier's data sheet goes before them.
"""

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from types import MappingProxyType

HEADING = "General caution. Your supplier's safety data sheet and local rules take precedence."
DEFERRAL = (
    "General caution. The supplier's safety data sheet, local rules and, where the law asks for "
    "it, a licensed person come first. Hazards depend on concentration and amount: read the sheet "
    "for the solution that you have. Spill, splash or exposure: follow your local emergency "
    "procedure now; the record can wait."
)
SOURCE = "Built-in text, from memory of commonly stated hazards; not from your supplier's sheet."


@dataclass(frozen=True, slots=True)
class Caution:
    """A substance by name, what to mind, and where the lines come from."""

    substance: str
    lines: tuple[str, ...]
    source: str = SOURCE


_ALKALINE = (
    "Strongly alkaline, also when dilute: a splash in the eye is an emergency (solid and strong "
    "solutions: H314, H290)."
)
_OXIDIZING = (
    "Oxidizer, harmful, harms water life (H272, H302, H314, H361d, H373, H410). Keep away from "
    "organic matter."
)
_CHROMIUM = (
    "Toxic, carcinogenic, oxidizer (H272, H301, H312, H314, H317, H330, H334, H340, H350, H360FD, "
    "H372, H410): restricted in many places. Ask for a method without chromium(VI). Keep away "
    "from organic matter."
)
_IODINE = "Harmful vapour, irritates, harms water life (H312, H332, H315, H319, H335, H372, H400)."
_FUMING = "Concentrated: burns skin and eyes, vapour irritates (H314, H290, H335); use the hood."
_ACID = "Acid into water, never the other way. Keep away from hypochlorite, cyanide, sulfide."
_COOLED = "Acid into water, slowly, cooled. Keep away from hypochlorite, cyanide, sulfide."
_OXIDIZER = "Keep away from organic matter and other things that burn."
_LOW = "Low hazard; avoid raising dust."
_GLOVES = "Wear eye protection and gloves."
_DRAIN = "Waste goes where your local rules say."

_CAUTIONS: Mapping[str, tuple[str, tuple[str, ...]]] = MappingProxyType(
    {
        "NaOH": (
            "sodium hydroxide",
            (
                _ALKALINE,
                "Heat when dissolving: add the solid slowly to water, never water to the solid.",
                _GLOVES,
            ),
        ),
        "KOH": (
            "potassium hydroxide",
            (
                _ALKALINE,
                "Heat when dissolving: add the solid slowly to water, never water to the solid.",
                _GLOVES,
            ),
        ),
        "HCl": (
            "hydrochloric acid",
            (
                _FUMING,
                _ACID,
                _GLOVES,
            ),
        ),
        "H2SO4": (
            "sulfuric acid",
            (
                "Concentrated: severe burns (H314, H290); much heat when diluted.",
                _COOLED,
                _GLOVES,
            ),
        ),
        "HClO4": (
            "perchloric acid",
            (
                "Oxidizer and corrosive (H271, H314). Keep away from organic matter, paper, wood.",
                "In acetic acid: flammable, never let it dry out.",
                _GLOVES,
            ),
        ),
        "KMnO4": (
            "potassium permanganate",
            (
                _OXIDIZING,
                _GLOVES,
                _DRAIN,
            ),
        ),
        "K2Cr2O7": (
            "potassium dichromate",
            (
                _CHROMIUM,
                _GLOVES,
                _DRAIN,
            ),
        ),
        "AgNO3": (
            "silver nitrate",
            (
                "Oxidizer, burns and stains skin and eyes, harms water life (H272, H314, H410).",
                "Never let it stand with ammonia: explosive silver compounds can form.",
                _GLOVES,
            ),
        ),
        "I2": (
            "iodine",
            (
                _IODINE,
                "Never together with ammonia: an explosive solid can form.",
                _GLOVES,
            ),
        ),
        "Na2S2O3": (
            "sodium thiosulfate",
            ("With acid it gives off sulfur dioxide and sulfur: keep apart.", _GLOVES),
        ),
        "EDTA": ("disodium edetate", ("Harmful when inhaled as dust (H332, H373).", _GLOVES)),
        "Ce(SO4)2": (
            "cerium(IV) sulfate",
            ("Oxidizing, in acid; serious eye damage (H318).", _GLOVES),
        ),
        "KHP": (
            "potassium hydrogen phthalate",
            (_LOW,),
        ),
        "Na2CO3": ("sodium carbonate", ("Irritates eyes (H319). Froths with acid.",)),
        "TRIS": ("tris(hydroxymethyl)aminomethane", (_LOW,)),
        "C7H6O2": ("benzoic acid", ("Serious eye damage, irritates (H318, H315, H372).",)),
        "H2C2O4": (
            "oxalic acid",
            ("Harmful if swallowed or on skin, eye damage (H302, H312, H318).", _GLOVES),
        ),
        "Na2C2O4": ("sodium oxalate", ("Harmful if swallowed or on skin (H302, H312).", _GLOVES)),
        "KIO3": (
            "potassium iodate",
            (
                "Oxidizer; harmful if swallowed, eye damage (H272, H302, H318).",
                _OXIDIZER,
                _GLOVES,
            ),
        ),
        "KH(IO3)2": (
            "potassium hydrogen iodate",
            ("Oxidizer, corrosive (H272, H314).", _OXIDIZER, _GLOVES),
        ),
        "As2O3": (
            "arsenic trioxide",
            (
                "Very toxic, carcinogenic (H300, H314, H350, H410): use another standard.",
                _GLOVES,
                _DRAIN,
            ),
        ),
        "Na2B4O7": (
            "borax",
            ("May harm fertility or the unborn child, irritates eyes (H360FD, H319).", _GLOVES),
        ),
        "NaCl": ("sodium chloride", (_LOW,)),
        "KCl": ("potassium chloride", (_LOW,)),
        "CaCO3": ("calcium carbonate", (f"{_LOW} Froths with acid.",)),
        "Zn": (
            "zinc",
            ("Gives off hydrogen with acid: no flame. Its dust burns, harms water life (H410).",),
        ),
        "ZnO": ("zinc oxide", ("Harms water life (H410).", _DRAIN)),
        "H3NO3S": ("sulfamic acid", ("Irritates eyes and skin (H319, H315).", _GLOVES)),
    }
)


def cautions_for(substances: Iterable[str]) -> tuple[Caution, ...]:
    """Return the cautions about substances by key, in their order, each once.

    A substance without a line of its own still gets one: nothing is ever called harmless.
    """
    found = []
    for key in dict.fromkeys(substances):
        name, lines = _CAUTIONS.get(
            key, (key, ("No caution is stored here: read the supplier's safety data sheet first.",))
        )
        found.append(Caution(name, lines))
    return tuple(found)
