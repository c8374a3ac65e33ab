"""The certificate's tables: readings, replicates, findings, roots and budget, cell by cell."""

import re
from collections.abc import Iterator, Mapping
from typing import Any

from server.reports.certificate.notes import Notes
from server.sheets.parts import outcome
from server.sheets.parts.roots import root_urls
from server.sheets.parts.telling import quantity_words, typed_day_words, unit_words

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
_SHAPES = {"holds": "full", "look": "open", "fails": "cross"}
_EXPONENT = re.compile(r"(?<=\d)e([+-]?\d+)\b")
_RAISED = str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹")
_STATED = {
    "error_u": "each error {}",
    "glass_expansion": "expansion of the glass {} per K",
    "minimum_sample_g": "minimum sample {} g",
    "received_g": "received {} g",
}


def readings(document: Mapping[str, Any], notes: Notes) -> dict[str, Any]:
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


def conditions(document: Mapping[str, Any], notes: Notes) -> Iterator[dict[str, Any]]:
    """Yield what was written for the sheet as a whole: the room, blanks, steps done."""
    for one in document["entries"]:
        if one["replicate"] == 0 and one["slot"] != "remark":
            text = f"{one['text']} {unit_words(one['unit'])}".strip()
            yield {"label": one["label"], "text": text, "marks": notes.of_entry(one)}


def replicates(result: Mapping[str, Any]) -> list[dict[str, str]]:
    """Return the replicates, also those left out."""
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


def findings(document: Mapping[str, Any], notes: Notes) -> Iterator[dict[str, Any]]:
    """Yield the findings, the gravest first; marks lead to the notes."""
    for one in outcome.finding_views(document["findings"]):
        yield {
            "name": one.name,
            "verdict": one.verdict,
            "shape": _SHAPES[one.verdict],
            "says": one.says,
            "figure": printed_figure(one.figure),
            "limit": printed_figure(one.limit),
            "basis": one.basis,
            "marks": notes.of_finding(one.name),
        }


def roots(document: Mapping[str, Any]) -> Iterator[dict[str, str]]:
    """Yield what the number rests on, with what each paper states."""
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
        says = _STATED.get(key, f"{key.replace('_', ' ')} {{}}")
        if isinstance(value, Mapping):
            words = quantity_words(value)
            if words:  # what is no quantity is told in its own words beside it
                yield says.format(words)
        elif key == "error_table":
            yield f"errors at {len(value)} points"
        elif isinstance(value, str | int | float):
            yield says.format(printed_figure(str(value)))


def budget(document: Mapping[str, Any]) -> list[dict[str, Any]]:
    """Return the budget, the largest share first, each line with its root."""
    names = {root: one["name"] for one in document["traceability"] for root in root_urls([one])}
    rows = outcome.budget_rows(document["result"], names)
    return [
        {
            "source": row.source,
            "root": row.root or "",
            "value": printed_figure(row.value),
            "u": printed_figure(row.u),
            "shape": row.shape,
            "dof": row.dof,
            "sensitivity": printed_figure(row.sensitivity),
            "contribution": printed_figure(row.contribution),
            "share": row.share,
            "shared": row.shared,
        }
        for row in rows
    ]


def printed_figure(text: str) -> str:
    """Return a figure with a true minus, and powers of ten as they are printed."""
    minus = f"−{text[1:]}" if text.startswith("-") else text
    return _EXPONENT.sub(lambda found: f"·10{str(int(found.group(1))).translate(_RAISED)}", minus)
