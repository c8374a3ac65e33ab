"""What the printed certificate is told: every figure, name and sentence of it, as text."""

import re
from collections.abc import Iterator, Mapping
from datetime import datetime
from typing import Any

from server.chemistry.substances import name_of
from server.lab.validity import read_zone
from server.reports.certificate_changes import changes_told
from server.reports.certificate_notes import Notes
from server.reports.certificate_pictures import bars_told, dots_told
from server.reports.issued import Issued
from server.sheets.parts import outcome
from server.sheets.parts.roots import root_urls
from server.sheets.parts.shelf_state import nominal_words
from server.sheets.parts.telling import (
    listed,
    moment_words,
    quantity_words,
    typed_day_words,
    unit_words,
)

_FIRST_SLOTS = (
    "tare_load",
    "mass",
    "container_and_standard",
    "container_less_standard",
    "pipette",
    "burette_start",
    "burette_end",
)
_LONG_CELL = 60
_UNBROKEN = re.compile(r"\S{40,}")
_PIECE = 20
_EXPONENT = re.compile(r"(?<=\d)e([+-]?\d+)\b")
_RAISED = str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹")
_STATED = {
    "error_u": "each error",
    "glass_expansion": "expansion of the glass per K",
    "minimum_sample_g": "minimum sample in g",
}
_SHAPES = {"holds": "full", "look": "open", "fails": "cross"}
_TITLES = {"measured": "analyst", "countersigned": "countersigner"}


def certificate_told(issued: Issued) -> dict[str, Any]:
    """Return all that the printed certificate shows, as texts and lists of texts."""
    document, zone = issued.document, issued.document["laboratory"]["zone"]
    result, notes = document["result"], Notes(document, zone)
    shown = outcome.printed(result)
    told = {
        "number": issued.number,
        "title": document["title"],
        "laboratory": document["laboratory"]["name"],
        "address": document["laboratory"]["address"],
        "band": _band(issued, zone),
        "value": {
            "name": f"{name_of(document['lot']['titrant']).capitalize()}, {document['lot']['name']}",
            "digits": shown.value,
            "uncertainty": shown.uncertainty,
            "unit": shown.unit,
            "says": f"Amount concentration at {result['concentration']['temperature_C']} °C. "
            f"Expanded uncertainty U, in the same unit, with k = {shown.k} for a coverage of "
            f"{shown.coverage}.",
            "factor": shown.factor,
            "valid_for": document["valid_for"],
            "valid_until": typed_day_words(document["validity"]["last_day"]),
            "rule": document["validity"]["rule"],
        },
        "facts": _facts(issued, zone),
        "statements": list(_statements(document)),
        "signatures": list(_signatures(issued)),
        "reviewed": document["independently_reviewed"],
        "changes": changes_told(issued),
        "readings": _readings(document, notes),
        "conditions": list(_conditions(document, notes)),
        "replicates": _replicates(result),
        "spread": outcome.dots_says(result),
        "dots": dots_told(result),
        "findings": list(_findings(document, notes)),
        "roots": list(_roots(document)),
        "budget": _budget(document),
        "budget_says": outcome.budget_says(result),
        "bars": bars_told(result),
        "monte_carlo": outcome.monte_carlo_says(result),
        "constants": [list(one) for one in outcome.constants(result)],
        "calculation": outcome.calculation(result),
        "notes": notes.told(),
        "attached": f"{issued.number}.json, this document in its canonical text; {issued.number}.jws, "
        "the same signed by the laboratory where its key is at hand (RFC 7515)",
        "digests": _digests(issued),
        "url": issued.url or "",
    }
    broken: dict[str, Any] = _breakable(told)
    return broken


def instant_words(at: str, zone: str) -> str:
    """Return an instant with its zone and the zone's offset on that day."""
    local = datetime.fromisoformat(at).astimezone(read_zone(zone))
    offset = f"{local:%z}"
    return f"{moment_words(local, zone)} ({zone}, UTC{offset[:3]}:{offset[3:5]})"


def _band(issued: Issued, zone: str) -> dict[str, str] | None:
    """Return what is printed across every page of a certificate that must not be relied on."""
    as_of = instant_words(issued.as_of.isoformat(), zone)
    if not issued.holds:
        says = "This text is not the one that was issued. Rely on nothing here; tell the keeper."
        return {"word": "altered", "says": f"{says} Printed {as_of}."}
    if issued.stands:
        return None
    says = f"{issued.state_says} " if issued.state_says else ""
    if issued.replaced_by is not None:
        says = f"Replaced by certificate {issued.replaced_by}. {says}"
    else:
        says = f"The lot is pulled: do not use it. {says}"
    return {"word": issued.state, "says": f"{says}State at printing, {as_of}."}


def _facts(issued: Issued, zone: str) -> list[list[str]]:
    document = issued.document
    lot, laboratory, recipe = document["lot"], document["laboratory"], document["recipe"]
    end_point, measured = document["end_point"], document["measured"]
    facts = [
        ("Laboratory", ", ".join(one for one in (laboratory["name"], laboratory["address"]) if one)),
        ("Prepared for", "the laboratory itself, and performed at its own address"),
        (
            "Item",
            f"{name_of(lot['titrant'])}, {nominal_words(lot['nominal'])}, in {lot['medium']}; lot "
            f"{lot['name']}, code {lot['code']}; made by {lot['made_by']}"
            + (f", {typed_day_words(lot['prepared_on'])}" if lot["prepared_on"] else ""),
        ),
        ("Method", f"{recipe['title']} (recipe {recipe['name']}, version {recipe['version']})"),
        ("End point", _end_point(end_point)),
        (
            "Measured",
            _span(measured, zone) + (f", by {listed(measured['by'])}" if measured["by"] else ""),
        ),
        ("Issued", instant_words(document["issued_at"], zone)),
        ("Bench sheet", document["sheet"]["number"]),
    ]
    if document["replaces"]:
        facts.append(("Replaces", f"certificate {document['replaces']}"))
    return [list(one) for one in facts]


def _span(measured: Mapping[str, Any], zone: str) -> str:
    """Return from when to when it was measured; what both ends share is said once."""
    first, last = (instant_words(measured[end], zone) for end in ("from", "to"))
    day, _, _ = first.partition(", ")
    start, _, offset = first.partition(" (")
    if last.startswith(f"{day}, ") and last.endswith(offset):
        return f"{start} to {last.removeprefix(f'{day}, ')}"
    return f"{first} to {last}"


def _end_point(end_point: Mapping[str, Any]) -> str:
    indicator = end_point["indicator"]
    return f"{end_point['mode']}, {indicator}" if indicator else str(end_point["mode"])


def _statements(document: Mapping[str, Any]) -> Iterator[str]:
    yield from document["statements"]
    yield (
        "Traceability: the value rests on the standard and the calibrations under “What the number "
        "rests on”, each with its certificate and issuer, and is as traceable as those are."
    )
    yield "No measurement was made outside the laboratory."
    yield (
        "Decision rule of the findings: the figure is compared with its limit as it stands, "
        "without a guard band, unless the basis says otherwise."
    )
    yield "Handling and hazards: the supplier's safety data sheet and the laboratory's own rules."


def _signatures(issued: Issued) -> Iterator[dict[str, Any]]:
    holds = issued.signatures_hold
    for place, one in enumerate(issued.document["signatures"]):
        yield {
            "name": one["printed_name"],
            "title": _TITLES.get(one["meaning"], ""),
            "meaning": one["meaning"],
            "at": instant_words(one["at"], one["zone"]),
            "remark": one["remark"] or "",
            "digest": one["signed_digest"],
            "broken": place < len(holds) and not holds[place],
        }


def _readings(document: Mapping[str, Any], notes: Notes) -> dict[str, Any]:
    """Return the readings as written, a line for each replicate; marks lead to the notes."""
    entries = [one for one in document["entries"] if one["replicate"] and _is_reading(one)]
    slots = sorted({one["slot"] for one in entries}, key=_slot_order)
    heads = {one["slot"]: (one["label"], unit_words(one["unit"])) for one in entries}
    lines = []
    for replicate in sorted({one["replicate"] for one in entries}):
        cells = []
        for slot in slots:
            found = [one for one in entries if (one["replicate"], one["slot"]) == (replicate, slot)]
            texts = [_short(one["text"]) for one in sorted(found, key=lambda one: one["segment"])]
            marks = [mark for one in found for mark in notes.of_entry(one)]
            cells.append({"text": " / ".join(texts), "marks": marks})
        lines.append({"label": str(replicate), "cells": cells})
    return {"heads": [list(heads[slot]) for slot in slots], "lines": lines}


def _is_reading(entry: Mapping[str, Any]) -> bool:
    return entry["slot"] not in {"remark", "excluded"}


def _slot_order(slot: str) -> tuple[int, str]:
    known = slot in _FIRST_SLOTS
    return (_FIRST_SLOTS.index(slot) if known else len(_FIRST_SLOTS), slot)


def _short(text: str) -> str:
    says = f"{len(text)} characters, in the attached document"
    return text if len(text) <= _LONG_CELL else says


def _conditions(document: Mapping[str, Any], notes: Notes) -> Iterator[dict[str, Any]]:
    """Yield what was written for the sheet as a whole: the room, blanks, steps done."""
    for one in document["entries"]:
        if one["replicate"] == 0 and one["slot"] != "remark":
            text = f"{one['text']} {unit_words(one['unit'])}".strip()
            yield {"label": one["label"], "text": text, "marks": notes.of_entry(one)}


def _replicates(result: Mapping[str, Any]) -> list[dict[str, str]]:
    return [
        {
            "label": one.label,
            "mass": one.mass,
            "amount": one.amount,
            "volume": one.volume,
            "value": one.value,
            "excluded": one.excluded or "",
        }
        for one in outcome.replicate_rows(result)
    ]


def _findings(document: Mapping[str, Any], notes: Notes) -> Iterator[dict[str, Any]]:
    for one in outcome.finding_views(document["findings"]):
        yield {
            "name": one.name,
            "verdict": one.verdict,
            "shape": _SHAPES[one.verdict],
            "says": one.says,
            "figure": _printed(one.figure),
            "limit": _printed(one.limit),
            "basis": one.basis,
            "marks": notes.of_finding(one.name),
        }


def _roots(document: Mapping[str, Any]) -> Iterator[dict[str, str]]:
    for one in document["traceability"]:
        paper = f"{one['certificate_number']}" + (
            f", version {one['version']}" if one["version"] and one["version"] > 1 else ""
        )
        override = one["override"]
        yield {
            "kind": one["kind"],
            "name": one["name"],
            "paper": paper,
            "issuer": one["issuer"],
            "done": typed_day_words(one["done_on"]),
            "due": typed_day_words(one["due_on"]),
            "state": one["state"],
            "states": "; ".join(_stated(one["statements"])),
            "override": (
                f"used by {override['by']}'s word: {override['reason']}" if override else ""
            ),
        }


def _stated(statements: Mapping[str, Any]) -> Iterator[str]:
    """Yield what a paper states of its quantities, in words."""
    for key, value in statements.items():
        name = _STATED.get(key, key.replace("_", " "))
        if isinstance(value, Mapping):
            yield f"{name} {quantity_words(value)}"
        elif key == "error_table":
            yield f"errors at {len(value)} points"
        elif isinstance(value, str | int | float):
            yield f"{name} {_printed(str(value))}"


def _budget(document: Mapping[str, Any]) -> list[dict[str, Any]]:
    names = {root: one["name"] for one in document["traceability"] for root in root_urls([one])}
    rows = outcome.budget_rows(document["result"], names)
    return [
        {
            "source": row.source,
            "root": row.root or "",
            "value": _printed(row.value),
            "u": _printed(row.u),
            "shape": row.shape,
            "dof": row.dof,
            "sensitivity": _printed(row.sensitivity),
            "contribution": _printed(row.contribution),
            "share": row.share,
            "shared": row.shared,
        }
        for row in rows
    ]


def _digests(issued: Issued) -> list[list[str]]:
    document = issued.document
    return [
        ["this document", issued.document_digest],
        ["evaluation", document["snapshot_digest"]],
        ["bench record", document["input_digest"]],
        [f"trail, act {issued.anchor.seq}", issued.anchor.hash],
    ]


def _printed(text: str) -> str:
    """Return a figure with a true minus, and powers of ten as they are printed."""
    minus = f"−{text[1:]}" if text.startswith("-") else text
    return _EXPONENT.sub(lambda found: f"·10{str(int(found.group(1))).translate(_RAISED)}", minus)


def _breakable(value: Any) -> Any:
    """Return texts with places to break in what is long and has no space."""
    if isinstance(value, Mapping):
        return {key: _breakable(one) for key, one in value.items()}
    if isinstance(value, list):
        return [_breakable(one) for one in value]
    return _UNBROKEN.sub(_pieces, value) if isinstance(value, str) else value


def _pieces(found: re.Match[str]) -> str:
    text = found.group()
    return "\u200b".join(text[at : at + _PIECE] for at in range(0, len(text), _PIECE))
