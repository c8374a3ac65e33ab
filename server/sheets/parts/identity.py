"""The record of an instrument, field by field (ISO/IEC 17025, 6.4.13)."""

from collections.abc import Mapping, Sequence
from typing import Any

from server.lab.identity import is_not_applicable
from server.lab.sheet_facts import BALANCE, BURETTE, FLASK, PIPETTE, THERMOMETER
from server.records.queries.list_stores import KeptCalibration
from server.sheets.instruments import IdentityField
from server.sheets.parts.telling import last_day_words, listed, typed_day_words
from server.sheets.stores import Fact

STATED, NOT_APPLICABLE, MISSING = "stated", "not applicable", "missing"
_UNITS = {BALANCE: "g", BURETTE: "mL", PIPETTE: "mL", FLASK: "mL", THERMOMETER: "°C"}
_SCALE = {
    "resolution": "Resolution",
    "capacity": "Capacity",
    "decimals": "Decimals of a reading",
    "minimum_g": "Smallest mass, as registered",
}


def identity_fields(
    name: str,
    kind: str,
    document: Mapping[str, Any],
    kept: Sequence[KeptCalibration],
    zone: str,
) -> tuple[IdentityField, ...]:
    """Return the fields of the record: each stated, not applicable with its reason, or missing.

    What the calibrations tell stands there by itself; ``kept`` are they, the newest first.
    """
    told = [(label, str(document.get(key) or "")) for key, label in _DESCRIBED[:6]]
    done = listed([typed_day_words(one.row.done_on) for one in kept[:3]]) if kept else ""
    newest = kept[0].row if kept else None
    due = f"{last_day_words(newest.due_at, zone)} ({newest.due_basis})" if newest else ""
    told += [
        ("Calibrated on", done),
        ("Result", _result(newest)),
        ("Adjustments", str(document.get("adjustments") or "")),
        ("Acceptance criteria", str(document.get("acceptance") or "") or _criteria(newest)),
        ("Next due", due),
        ("Reference materials", str(document.get("references") or "") or _references(newest)),
    ]
    named = IdentityField("What it is", f"{name} ({kind})", STATED)
    return (named, *(_field(label, value) for label, value in told))


_DESCRIBED = (
    ("software", "Software or firmware"),
    ("maker", "Maker"),
    ("type", "Type"),
    ("serial", "Serial number"),
    ("verification", "Found fit before use"),
    ("location", "Where it stands"),
)


def scale_facts(kind: str, document: Mapping[str, Any]) -> list[Fact]:
    """Return what is fixed of an instrument's scale."""
    unit = _UNITS.get(kind, "")
    units = {"resolution": unit, "capacity": unit, "minimum_g": "g"}
    return [
        Fact(label, f"{document[key]} {units.get(key, '')}".strip())
        for key, label in _SCALE.items()
        if document.get(key)
    ]


def _field(label: str, value: str) -> IdentityField:
    if not value:
        return IdentityField(label, "not stated yet", MISSING)
    return IdentityField(label, value, NOT_APPLICABLE if is_not_applicable(value) else STATED)


def _result(newest: Any) -> str:
    if newest is None:
        return ""
    number = f"{newest.certificate_number}, version {newest.version}, {newest.issuer}"
    verdict = (newest.run or {}).get("verdict")
    return f"{verdict}: {number}" if verdict else number


def _criteria(newest: Any) -> str:
    """Return the specification that the serving run was judged by, with its decision rule."""
    checks = ((newest.run if newest else None) or {}).get("checks", ())
    named = (f"{one['basis']}, by {one['rule']}" for one in checks if one["rule"])
    return next(named, "")


def _references(newest: Any) -> str:
    """Return the calibrations that the serving run rests on."""
    used = ((newest.run if newest else None) or {}).get("used", ())
    return "; ".join(
        f"{one['name']}, {one['certificate_number']}, version {one['version']}" for one in used
    )
