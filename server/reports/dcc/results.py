"""The measured part of a DCC: methods, equipment, conditions, results, findings."""

from collections.abc import Iterator, Mapping
from typing import Any
from xml.etree.ElementTree import Element

from server.chemistry.substances import name_of
from server.lab.canonical import canonical, digest
from server.metrology.rounding import rounded, significant
from server.reports.dcc import elements as el
from server.sheets.parts.certificate_words import end_point_words
from server.sheets.parts.outcome import printed, replicate_rows

_CONFORMITY = {"holds": "pass", "look": "conditionalPass", "fails": "fail"}
_RULE = "Decision rule: figure against limit as it stands, without guard band, unless stated."


def add_results(
    root: Element, document: Mapping[str, Any], paper_hashes: Mapping[str, str]
) -> None:
    """Add the measurement's methods, software, equipment, conditions, results and findings."""
    titrant = name_of(document["lot"]["titrant"])
    made = el.dcc(el.dcc(root, "measurementResults"), "measurementResult")
    el.words(made, "name", f"Standardization of {titrant}")
    _methods(made, document)
    software = el.dcc(el.dcc(made, "usedSoftware"), "software")
    named = document["result"]["calculation"]
    el.words(software, "name", f"calculation {named['name']}")
    el.dcc(software, "release", f"v{named['version']}")
    el.dcc(software, "type", "application")
    equipments = el.dcc(made, "measuringEquipments")
    for one in document["traceability"]:
        _equipment(equipments, one, paper_hashes)
    conditions = el.dcc(made, "influenceConditions")
    for name, text, unit in _conditions(document):
        _condition(conditions, name, text, unit)
    _results(el.dcc(made, "results"), document, titrant)
    findings = el.dcc(made, "measurementMetaData")
    for one in document["findings"]:
        _finding(findings, one)


def _methods(made: Element, document: Mapping[str, Any]) -> None:
    recipe = document["recipe"]
    methods = el.dcc(made, "usedMethods")
    method = el.dcc(methods, "usedMethod")
    el.words(method, "name", recipe["title"])
    el.words(method, "description", f"recipe {recipe['name']}, version {recipe['version']}")
    law = el.dcc(methods, "usedMethod", refType="basic_methodMeasurementUncertainty")
    el.words(law, "name", document["result"]["constants"]["models"]["uncertainty"])


def _equipment(
    equipments: Element, one: Mapping[str, Any], paper_hashes: Mapping[str, str]
) -> None:
    """Add a calibration or standard lot with the hash of its paper.

    Where no original file is kept the hash is that of the statements, as they were recorded.
    """
    made = el.dcc(equipments, "measuringEquipment")
    el.words(made, "name", one["name"])
    el.words(made, "description", f"{one['kind']}; {one['says']}")
    paper = paper_hashes.get(one["calibration_id"] or one["id"])
    about = "Of the original file, as it is kept."
    if paper is None:
        paper = digest(canonical(one["statements"]))
        about = "Of what the paper states, as recorded, in canonical JSON text; no file is kept."
    el.hashed(
        made,
        "certificate",
        says=one["issuer"],
        identifier=one["certificate_number"],
        value=paper,
        about=about,
    )
    identification = el.dcc(el.dcc(made, "identifications"), "identification")
    el.dcc(identification, "issuer", "calibrationLaboratory")
    el.dcc(identification, "value", one["calibration_id"] or one["id"])


def _conditions(document: Mapping[str, Any]) -> Iterator[tuple[str, str, str]]:
    """Yield what was written for the sheet as a whole, and the end point."""
    yield "end point", end_point_words(document["end_point"]), ""
    for one in document["entries"]:
        if one["replicate"] == 0 and one["slot"] != "remark":
            yield one["label"], one["text"], one["unit"] or ""


def _condition(conditions: Element, name: str, text: str, unit: str) -> None:
    made = el.dcc(conditions, "influenceCondition")
    el.words(made, "name", name)
    data = el.dcc(made, "data")
    if unit in el.UNITS and unit and el.is_decimal(text):
        quantity = el.dcc(data, "quantity")
        el.words(quantity, "name", name)
        el.real(quantity, text, unit)
    else:
        el.words(data, "text", f"{text} {unit}".strip())


def _results(results: Element, document: Mapping[str, Any], titrant: str) -> None:
    result, shown = document["result"], printed(document["result"])
    concentration = result["concentration"]
    made = el.dcc(results, "result")
    name = f"amount concentration of {titrant} at {concentration['temperature_C']} °C"
    el.words(made, "name", name)
    el.words(made, "description", concentration["reported"])
    data = el.dcc(made, "data")
    quantity = el.dcc(data, "quantity", refType="basic_measuredValue")
    el.words(quantity, "name", name)
    number = el.real(quantity, shown.value, shown.unit)
    _uncertainty(number, result)
    if shown.factor:
        factor = el.dcc(el.dcc(_named(results, "factor"), "data"), "quantity")
        el.words(factor, "name", "concentration by the nominal one")
        el.real(factor, shown.factor, "")
    rows = [one for one in replicate_rows(result) if one.value]
    if rows:
        replicates = el.dcc(el.dcc(_named(results, "replicates"), "data"), "quantity")
        out = [row.label for row in rows if row.excluded]
        left_out = f"; left out of the mean: {', '.join(out)}" if out else ""
        labels = ", ".join(row.label for row in rows)
        el.words(replicates, "name", f"concentrations of replicates {labels}{left_out}")
        el.real_list(replicates, [row.value for row in rows], shown.unit)


def _uncertainty(number: Element, result: Mapping[str, Any]) -> None:
    """Add what is printed beside the value: U, or the Monte Carlo interval where that is."""
    shown, concentration = printed(result), result["concentration"]
    coverage = f"{concentration['coverage']:g}"
    if not shown.interval:
        el.expanded(number, uncertainty=shown.uncertainty, k=shown.k, coverage=coverage)
        return
    run = result["monte_carlo"]
    low, high = (rounded(run[end], -shown.decimals) for end in ("low", "high"))
    u = significant(run["u"] or concentration["u"])
    el.interval(number, u=u, low=low, high=high, coverage=coverage)


def _named(results: Element, name: str) -> Element:
    made = el.dcc(results, "result")
    el.words(made, "name", name)
    return made


def _finding(findings: Element, one: Mapping[str, Any]) -> None:
    made = el.dcc(findings, "metaData")
    el.words(made, "name", one["name"])
    parts = [one["says"]]
    if one["figure_text"]:
        parts.append(f"Figure: {one['figure_text']}.")
    if one["limit_text"]:
        parts.append(f"Limit: {one['limit_text']}.")
    if one["reason"]:
        parts.append(f"Reason: {one['reason']}.")
    if one["accepted_by"]:
        parts.append(f"Accepted by {one['accepted_by']}.")
    el.words(made, "description", " ".join(parts))
    el.words(made, "declaration", f"{one['basis']}. {_RULE}")
    el.dcc(made, "conformity", _CONFORMITY[one["verdict"]])
