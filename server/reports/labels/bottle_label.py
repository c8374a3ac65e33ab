"""What stands on a bottle's label."""

from dataclasses import dataclass
from datetime import date, datetime
from typing import Any
from urllib.parse import urlsplit

from server.lab.codes import holds
from server.lab.label_hazards import PICTOGRAMS, check_hazards
from server.lab.own_site import read_base_url
from server.lab.refusal import Unacceptable
from server.lab.validity import local_day
from server.sheets.parts.telling import day_words


@dataclass(frozen=True, slots=True)
class ConfirmedHazards:
    """Pictograms, signal word and statements that the laboratory's responsible person confirmed."""

    pictograms: tuple[str, ...]
    signal_word: str
    statements: tuple[str, ...]
    confirmed_by: str
    confirmed_on: date


@dataclass(frozen=True, slots=True)
class PrintedValue:
    """The certified concentration, where the laboratory wants it on the label all the same."""

    reported: str
    certificate: str
    valid_until: str


@dataclass(frozen=True, slots=True)
class Reprint:
    """Why a label is printed again, and when."""

    reason: str
    at: datetime


@dataclass(frozen=True, slots=True)
class BottleLabel:
    """One bottle's label: by default no number but the nominal one.

    ``nominal`` is in words, with its unit. ``zone`` is the laboratory's, for the day of a reprint.
    """

    code: str
    titrant: str
    nominal: str
    lot: str
    bottle: int
    made_on: str
    laboratory: str
    address: str
    zone: str
    hazards: ConfirmedHazards | None = None
    value: PrintedValue | None = None
    reprint: Reprint | None = None


def bottle_url(base_url: str, code: str) -> str:
    """Return the address behind a label: upper case, so that its QR code is small.

    Raises:
        Unacceptable: the base is no http address, or the code none of a bottle.
    """
    if not holds(code):
        raise Unacceptable(f"“{code[:40]}” is no code of a bottle.", field="code")
    base = read_base_url(base_url)
    if not base:
        says = "The laboratory's own address must be an http address without question marks."
        raise Unacceptable(says, field="base_url", example="https://ledger.example")
    parts = urlsplit(base)
    host = f"{parts.scheme}://{parts.netloc}".upper()
    return f"{host}{parts.path.rstrip('/')}/B/{code}"


def label_told(label: BottleLabel, *, brief: bool = False) -> dict[str, Any]:
    """Return what a label shows, as texts.

    ``brief``: for a small label, the laboratory's name without its address, no day of making, no
    reason of a reprint.

    Raises:
        Unacceptable: hazards without who confirmed them, a pictogram that is none, a reprint or a
            printed value that lacks its words.
    """
    return {
        "code": f"{label.code[:4]} {label.code[4:]}",
        "titrant": label.titrant,
        "nominal": f"nominal {label.nominal}",
        "lot": f"Lot {label.lot}, bottle {label.bottle}",
        "made": f"Made {label.made_on}" if label.made_on and not brief else "",
        "laboratory": ", ".join(
            one for one in (label.laboratory, "" if brief else label.address) if one
        ),
        "value": _value(label.value, brief=brief),
        "hazards": _hazards(label.hazards),
        "reprint": _reprint(label, brief=brief),
    }


def _value(value: PrintedValue | None, *, brief: bool) -> list[str]:
    if value is None:
        return ["Value: scan." if brief else "Value and state: scan, or look up the code."]
    if not (value.reported.strip() and value.certificate.strip() and value.valid_until.strip()):
        says = "A value is printed only with its certificate and the day until which it is valid."
        raise Unacceptable(says, field="value")
    if brief:
        return [value.reported, f"{value.certificate}, until {value.valid_until}"]
    return [
        value.reported,
        f"Certificate {value.certificate}, valid until {value.valid_until}. Scan for today's.",
    ]


def _hazards(hazards: ConfirmedHazards | None) -> dict[str, Any] | None:
    if hazards is None:
        return None
    if not hazards.confirmed_by.strip():
        says = "Hazards are printed only where the laboratory's responsible person confirmed them."
        raise Unacceptable(says, field="hazards.confirmed_by", example="a name")
    check_hazards(hazards.pictograms, hazards.signal_word, field="hazards.")
    return {
        "pictograms": [
            {"key": one, "name": PICTOGRAMS[one]} for one in dict.fromkeys(hazards.pictograms)
        ],
        "signal_word": hazards.signal_word,
        "statements": " ".join(hazards.statements),
        "confirmed": (f"Confirmed {day_words(hazards.confirmed_on)}, {hazards.confirmed_by}."),
    }


def _reprint(label: BottleLabel, *, brief: bool) -> str:
    if label.reprint is None:
        return ""
    if not label.reprint.reason.strip():
        says = "A label is printed again with a reason."
        raise Unacceptable(says, field="reprint.reason", example="label lost in the wash")
    day = day_words(local_day(label.reprint.at, label.zone))
    return f"Printed again {day}" if brief else f"Printed again {day}: {label.reprint.reason}"
