"""What a certificate says in words, the same on its page and on paper."""

from collections.abc import Iterator, Mapping
from typing import Any

from server.chemistry.substances import name_of
from server.sheets.parts.shelf_state import nominal_words
from server.sheets.parts.telling import listed, typed_day_words

CUSTOMER = "the laboratory itself, and performed at its own address"


def item_words(lot: Mapping[str, Any]) -> str:
    """Return what was standardized: titrant, lot, code, who made it up and when."""
    made = f", {typed_day_words(lot['prepared_on'])}" if lot["prepared_on"] else ""
    return (
        f"{name_of(lot['titrant'])}, {nominal_words(lot['nominal'])}, in {lot['medium']}; lot "
        f"{lot['name']}, code {lot['code']}; made by {lot['made_by']}{made}"
    )


def end_point_words(end_point: Mapping[str, Any]) -> str:
    """Return how the end point was found: mode, and the indicator or the ways taken on curves.

    Where replicates were taken by different ways, each way names its replicates.
    """
    ways = end_point.get("methods") or ()
    told = [one["method"] for one in ways]
    if len(told) > 1:
        told = [_way_words(one) for one in ways]
    parts = (end_point["mode"], end_point["indicator"], " and ".join(told))
    return ", ".join(one for one in parts if one)


def _way_words(way: Mapping[str, Any]) -> str:
    labels = way["replicates"]
    return f"{way['method']} (replicate{'s' if len(labels) > 1 else ''} {listed(labels)})"


def statement_lines(document: Mapping[str, Any]) -> Iterator[str]:
    """Yield the statements of the document, and those that hold for every certificate."""
    yield from document["statements"]
    yield (
        "Traceability: the value rests on the standard and the calibrations under “What the number "
        "rests on”, each with its certificate and issuer, and is as traceable as those are."
    )
    yield "No result from outside the laboratory enters but what those papers state."
    yield (
        "Decision rule of the findings: the figure is compared with its limit as it stands, "
        "without a guard band, unless the basis says otherwise."
    )
    yield (
        "Not examined, and so not stated: homogeneity between bottles, a minimum sample, "
        "commutability, conditions of storage."
    )
    yield "Handling and hazards: the supplier's safety data sheet and the laboratory's own rules."
