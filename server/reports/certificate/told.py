"""What the printed certificate is told: every figure, name and sentence of it, as text."""

from collections.abc import Iterator, Mapping
from datetime import datetime
from typing import Any

from server.chemistry.substances import name_of
from server.lab.validity import read_zone
from server.reports.certificate import tables
from server.reports.certificate.changes import changes_told
from server.reports.certificate.notes import Notes
from server.reports.certificate.pictures import bars_told, dots_told
from server.reports.issued import Issued
from server.sheets.parts import outcome
from server.sheets.parts.certificate_words import (
    CUSTOMER,
    end_point_words,
    item_words,
    statement_lines,
)
from server.sheets.parts.telling import (
    listed,
    moment_words,
    typed_day_words,
)

_LONG_REMARK = 240
_TITLES = {"measured": "analyst", "countersigned": "countersigner"}


def certificate_told(issued: Issued) -> dict[str, Any]:
    """Return all that the printed certificate shows, as texts and lists of texts."""
    document, zone = issued.document, issued.document["laboratory"]["zone"]
    result, notes = document["result"], Notes(document, zone)
    shown = outcome.printed(result)
    return {
        "paper": issued.paper,
        "number": issued.number,
        "title": document["title"],
        "laboratory": document["laboratory"]["name"],
        "address": document["laboratory"]["address"],
        "band": _band(issued, zone),
        "value": _value(document, shown),
        "facts": _facts(issued, zone),
        "statements": list(statement_lines(document)),
        "signatures": list(_signatures(issued, notes)),
        "reviewed": document["independently_reviewed"],
        "changes": changes_told(issued),
        "readings": tables.readings(document, notes),
        "conditions": list(tables.conditions(document, notes)),
        "replicates": tables.replicates(result),
        "spread": outcome.dots_says(result),
        "dots": dots_told(result),
        "findings": list(tables.findings(document, notes)),
        "roots": list(tables.roots(document)),
        "budget": tables.budget(document),
        "budget_says": outcome.budget_says(result),
        "bars": bars_told(result),
        "monte_carlo": outcome.monte_carlo_says(result),
        "constants": [list(one) for one in outcome.constants(result)],
        "calculation": outcome.calculation(result),
        "notes": notes.told(),
        "attached": f"{issued.number}.json, this document in its canonical text; "
        f"{issued.number}.jws, the same signed by the laboratory where its key is at hand "
        "(RFC 7515)",
        "digests": _digests(issued),
        "url": issued.url or "",
    }


def _value(document: Mapping[str, Any], shown: outcome.Printed) -> dict[str, str]:
    """Return the certified value: with U, or the Monte Carlo interval where that is printed."""
    result, validity = document["result"], document["validity"]
    temperature = f"Amount concentration at {result['concentration']['temperature_C']} °C."
    percent = f"{100 * result['concentration']['coverage']:g} %"
    says = (
        f"Expanded uncertainty U, in the same unit, with k = {shown.k} for a coverage of {percent}."
    )
    if shown.interval:
        says = f"Coverage interval of {percent}: {shown.interval}; it is not told by U and k."
    return {
        "name": _name(document["lot"]),
        "digits": shown.value,
        "uncertainty": "" if shown.interval else shown.uncertainty,
        "unit": shown.unit,
        "says": f"{temperature} {says}",
        "reported": result["concentration"]["reported"],
        "factor": shown.factor,
        "valid_for": document["valid_for"],
        "valid_until": typed_day_words(validity["last_day"]),
        "rule": validity["rule"],
    }


def _name(lot: Mapping[str, Any]) -> str:
    return f"{name_of(lot['titrant']).capitalize()}, {lot['name']}"


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
    laboratory, recipe = document["laboratory"], document["recipe"]
    measured = document["measured"]
    facts = [
        (
            "Laboratory",
            ", ".join(one for one in (laboratory["name"], laboratory["address"]) if one),
        ),
        ("Prepared for", CUSTOMER),
        ("Item", item_words(document["lot"])),
        ("Method", f"{recipe['title']} (recipe {recipe['name']}, version {recipe['version']})"),
        ("End point", end_point_words(document["end_point"])),
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


def _signatures(issued: Issued, notes: Notes) -> Iterator[dict[str, Any]]:
    holds = issued.signatures_hold
    for place, one in enumerate(issued.document["signatures"]):
        remark, marks = one["remark"] or "", []
        if len(remark) > _LONG_REMARK:
            says = f"{one['printed_name']}, signing “{one['meaning']}”: {remark}"
            remark, marks = "", [notes.add(says)]
        yield {
            "name": one["printed_name"],
            "title": _TITLES.get(one["meaning"], ""),
            "meaning": one["meaning"],
            "at": instant_words(one["at"], one["zone"]),
            "remark": remark,
            "marks": marks,
            "digest": one["signed_digest"],
            "broken": place < len(holds) and not holds[place],
        }


def _digests(issued: Issued) -> list[list[str]]:
    document = issued.document
    return [
        ["this document", issued.document_digest],
        ["evaluation", document["snapshot_digest"]],
        ["bench record", document["input_digest"]],
        [f"trail, act {issued.anchor.seq}", issued.anchor.hash],
    ]
