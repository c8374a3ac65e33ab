"""Elements of a DCC, made so that no text can break the XML, and quantities of D-SI.

DCC 3.3.0 and D-SI 2.2: Physikalisch-Technische Bundesanstalt, ptb.de/dcc and ptb.de/si.
"""

import re
from collections.abc import Sequence
from xml.etree.ElementTree import Element, SubElement

DCC, SI = "https://ptb.de/dcc", "https://ptb.de/si"
LANGUAGE = "en"
#: UCUM's words, in which the laboratory states its units, as D-SI spells them.
UNITS = {
    "mol/L": r"\mole\litre\tothe{-1}",
    "mmol": r"\milli\mole",
    "g": r"\gram",
    "mg": r"\milli\gram",
    "mL": r"\milli\litre",
    "Cel": r"\degreecelsius",
    "hPa": r"\hecto\pascal",
    "mV": r"\milli\volt",
    "%": r"\percent",
    "1/K": r"\kelvin\tothe{-1}",
    "g/mol": r"\gram\mole\tothe{-1}",
    "g/cm3": r"\gram\centi\metre\tothe{-3}",
    "": r"\one",
}
_ILLEGAL = re.compile("[^\t\n\r\x20-\ud7ff\ue000-\ufffd\U00010000-\U0010ffff]")
_DECIMAL = re.compile(r"[-+]?\d+(\.\d+)?([eE][-+]?\d+)?", re.ASCII)
_NOTHING = "not stated"


def dcc(parent: Element, name: str, text: str | None = None, **attributes: str) -> Element:
    """Add an element of the DCC, with a text that is never empty or ends in spaces where given."""
    made = SubElement(parent, f"{{{DCC}}}{name}", attributes)
    if text is not None:
        made.text = _solid(text)
    return made


def words(parent: Element, name: str, text: str) -> Element:
    """Add an element that holds a text in the certificate's language."""
    made = dcc(parent, name)
    dcc(made, "content", text, lang=LANGUAGE)
    return made


def is_decimal(text: str) -> bool:
    """Say whether a text is a decimal as D-SI writes it."""
    return _DECIMAL.fullmatch(text) is not None


def real(parent: Element, value: str, unit: str) -> Element:
    """Add a number digit by digit as it is printed, with its unit in UCUM's words."""
    made = SubElement(parent, f"{{{SI}}}real")
    _si(made, "value", value)
    _si(made, "unit", UNITS[unit])
    _si(made, "significantDigit", str(_significant(value)))
    return made


def expanded(number: Element, *, uncertainty: str, k: str, coverage: str) -> None:
    """Add the expanded uncertainty to a number."""
    inner = SubElement(number, f"{{{SI}}}measurementUncertaintyUnivariate")
    made = SubElement(inner, f"{{{SI}}}expandedMU")
    _si(made, "valueExpandedMU", uncertainty)
    _si(made, "coverageFactor", k)
    _si(made, "coverageProbability", coverage)
    _si(made, "distribution", "normal")


def interval(number: Element, *, u: str, low: str, high: str, coverage: str) -> None:
    """Add a coverage interval to a number, where no expanded uncertainty tells it."""
    inner = SubElement(number, f"{{{SI}}}measurementUncertaintyUnivariate")
    made = SubElement(inner, f"{{{SI}}}coverageIntervalMU")
    _si(made, "valueStandardMU", u)
    _si(made, "intervalMin", low)
    _si(made, "intervalMax", high)
    _si(made, "coverageProbability", coverage)


def real_list(parent: Element, values: Sequence[str], unit: str) -> None:
    """Add a list of numbers of one unit."""
    made = SubElement(parent, f"{{{SI}}}realListXMLList")
    _si(made, "valueXMLList", " ".join(values))
    _si(made, "unitXMLList", UNITS[unit])


def hashed(
    parent: Element, name: str, *, says: str, identifier: str, value: str, about: str
) -> None:
    """Add a reference to another document by its SHA-256."""
    made = dcc(parent, name)
    words(made, "referral", says)
    dcc(made, "referralID", identifier)
    dcc(made, "procedure", "SHA-256")
    dcc(made, "value", value)
    words(made, "description", about)


def _si(parent: Element, name: str, text: str) -> None:
    SubElement(parent, f"{{{SI}}}{name}").text = text


def _significant(value: str) -> int:
    digits = value.lower().partition("e")[0].lstrip("+-").replace(".", "").lstrip("0")
    return max(len(digits), 1)


def _solid(text: str) -> str:
    """Return a text without what XML cannot hold; something stands where there is nothing."""
    return _ILLEGAL.sub("\ufffd", text).strip() or _NOTHING
