"""A refusal's sentence with the words that stand on the page instead of a field's name."""

import re
from collections.abc import Mapping
from types import MappingProxyType

from server.lab.refusal import Refusal

#: What a field of a document is called on the pages of instruments and stores, by its path there.
LABELS: Mapping[str, str] = MappingProxyType(
    {
        "acceptance": "Acceptance criteria",
        "action": "The action limit",
        "adjustments": "Adjustments",
        "air.humidity": "Air humidity",
        "air.pressure": "Air pressure",
        "air.temperature": "Air temperature",
        "basis": "What the mass fraction holds for",
        "capacity": "Capacity",
        "centre": "The centre of the limits",
        "certificate_number": "The certificate's number",
        "class": "Class",
        "delivery": "The delivered volume",
        "density": "Density",
        "division": "Distance of the marks",
        "done_on": "The day on which it was done",
        "due_basis": "The basis of the due date",
        "due_on": "The due day",
        "ended_at": "The end of the drying",
        "error_table": "Correction, added to the reading",
        "error_u": "Uncertainty of the corrections",
        "first": "The list of first readings",
        "glass_expansion": "Cubic expansion",
        "hours": "Hours of drying",
        "humidity": "Humidity",
        "issuer": "Issued by",
        "kind": "What it is",
        "limits.eccentricity": "Eccentricity permitted",
        "limits.error": "Error permitted",
        "limits.hysteresis": "What up and down may differ by",
        "limits.offset": "Offset at most",
        "limits.slope_least": "Slope at least",
        "limits.slope_most": "Slope at most",
        "linearity": "Linearity of one reading",
        "location": "Where it stands",
        "maker": "The maker",
        "mass_fraction": "Mass fraction",
        "mass_g": "Mass",
        "minimum_g": "Smallest mass",
        "minimum_sample_g": "Smallest sample",
        "molar_mass": "Molar mass",
        "name": "The name",
        "next_on": "The next re-test",
        "nominal": "Nominal volume",
        "offset_mV": "Offset at pH 7",
        "received_g": "How much came",
        "received_on": "The day on which it was received",
        "reference_u": "U of the reference",
        "references": "Reference materials",
        "repeatability.load": "The load that is read again and again",
        "repeatability.readings": "“The same load again and again”",
        "retest_on": "The day of the re-test",
        "rule": "Decision rule",
        "says": "The remark",
        "shape": "What it is taken as",
        "slope_percent": "Slope",
        "software": "Software or firmware",
        "step": "Step of the scale",
        "temperature": "Temperature",
        "u_offset_mV": "u of the offset",
        "u_slope_percent": "u of the slope",
        "uncertainty.air_humidity": "Air humidity, ±",
        "uncertainty.air_pressure": "Air pressure, ±",
        "uncertainty.air_temperature": "Air temperature, ±",
        "uncertainty.evaporation": "Evaporation, ±",
        "uncertainty.reading": "One reading, ±",
        "uncertainty.temperature": "Temperature, ±",
        "uncertainty.water_temperature": "Water temperature, ±",
        "uncertainty.weighing": "One reading of the balance, ±",
        "verification": "Found fit before use",
        "volume": "Volume at 20 °C",
        "warning": "The warning limit",
    }
)
_PATH = re.compile(
    r"(?:document\.)?(?P<path>[A-Za-z_]+(?:\.[A-Za-z_]+)*)(?:\[(?P<row>\d+)\])?(?P<end>[:;]| \w+)"
)
#: What follows the name of a field where a sentence begins with it.
_VERBS = frozenset({":", ";", " cannot", " holds", " is", " must", " states", " takes"})
_STATED = {"u": "its u", "U": "its U", "half_width": "its bound", "k": "its k",
           "value": "its value", "shape": "its shape"}  # fmt: skip


def in_words(refusal: Refusal) -> Refusal:
    """Return a refusal whose sentence begins as the page calls the field; the field stays.

    An example that is a document is for scripts and is left out.
    """
    example = None if (refusal.example or "").startswith(("{", "[")) else refusal.example
    says = _in_words(refusal.says)
    if (says, example) == (refusal.says, refusal.example):
        return refusal
    return type(refusal)(says, field=refusal.field, example=example, shown=refusal.shown)


def _in_words(says: str) -> str:
    found = _PATH.match(says)
    if found is None or found["end"] not in _VERBS:
        return says
    label = _label(found["path"])
    if label is None:
        return says
    row = f", line {int(found['row']) + 1}" if found["row"] else ""
    return f"{label}{row}{says[found.start('end') :]}"


def _label(path: str) -> str | None:
    """Return what a path is called, also of one part of a quantity; None for another word."""
    if path in LABELS:
        return LABELS[path]
    head, _, tail = path.rpartition(".")
    if head in LABELS and tail in _STATED:
        return f"{LABELS[head]}, {_STATED[tail]}"
    if "_" in path or "." in path:
        return re.sub(r"[._]", " ", path).capitalize()
    return None
