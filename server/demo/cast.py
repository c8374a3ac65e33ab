"""The demo laboratory's people, papers and recipes. All of it is invented."""

from collections.abc import Mapping
from dataclasses import dataclass
from types import MappingProxyType
from typing import Any

NAME = "Tarnbeck Waterworks, Laboratory"
ADDRESS = "4 Filter Lane, Tarnbeck"
COUNTRY = "CH"


@dataclass(frozen=True, slots=True)
class Member:
    """A person of the demo laboratory."""

    sign_in_name: str
    printed_name: str
    roles: tuple[str, ...]


STEWARD = Member("marisol", "Marisol Venn", ("steward",))
IMKE = Member("imke", "Imke Thorvald", ("analyst",))
BASHIR = Member("bashir", "Bashir Oduya", ("analyst",))
OTTILIE = Member("ottilie", "Ottilie Renn", ("countersigner", "reader"))
JONAS = Member("jonas", "Jonas Halework", ("keeper",))
MEMBERS = (STEWARD, IMKE, BASHIR, OTTILIE, JONAS)

#: Words of which the demo makes its passwords, new ones for every data folder.
WORDS = (
    "gravel", "sluice", "otter", "copper", "meadow", "lantern", "heron", "pebble",
    "willow", "kettle", "barley", "harbour", "thistle", "marble", "candle", "ripple",
)  # fmt: skip


@dataclass(frozen=True, slots=True)
class Tool:
    """An instrument with its calibration, days counted back from the demo's start."""

    kind: str
    name: str
    identity: Mapping[str, str]
    certificate_number: str
    issuer: str
    done_days_ago: int
    due_in_days: int
    document: Mapping[str, Any]


_LAB = "Calibration house Norrland-Mitte (invented)"
BALANCE = Tool(
    "balance",
    "Balance B-2",
    {
        "maker": "Kvist Instruments (invented)",
        "type": "analytical, 220 g",
        "serial": "KV-220-0417",
        "location": "Weighing room",
        "resolution": "0.0001",
        "capacity": "220",
        "minimum_g": "0.12",
        "software": "3.1",
    },
    "NM-B-20417",
    _LAB,
    150,
    215,
    {
        "linearity": {"unit": "g", "half_width": "0.00015", "shape": "rectangular"},
        "error_table": [
            ["0", "0.0000"], ["20", "0.0000"], ["50", "0.0001"], ["100", "0.0001"],
            ["200", "-0.0002"],
        ],
        "error_u": {"unit": "g", "u": "0.00005"},
    },
)  # fmt: skip
BURETTE = Tool(
    "burette",
    "Piston burette P-25",
    {
        "maker": "Sandlund Dosing (invented)",
        "type": "piston burette, 25 mL",
        "serial": "SD-25-1183",
        "location": "Bench 2",
        "resolution": "0.01",
        "capacity": "25",
        "software": "1.8",
    },
    "TB-G-0093",
    "own gravimetric calibration (ISO 8655)",
    119,
    53,
    {},  # its calibration is a run of the laboratory's own, server.demo.runs
)
OLD_BURETTE = Tool(
    "burette",
    "Piston burette P-20",
    {
        "maker": "Sandlund Dosing (invented)",
        "type": "piston burette, 20 mL",
        "serial": "SD-20-0641",
        "location": "Bench 1",
        "resolution": "0.01",
        "capacity": "20",
    },
    "TB-G-0071",
    "own gravimetric calibration (ISO 8655)",
    190,
    -6,
    {
        "capacity": {"value": "20", "unit": "mL"},
        "delivery": {"unit": "mL", "half_width": "0.02", "shape": "triangular"},
        "glass_expansion": "9.9e-6",
    },
)
THERMOMETER = Tool(
    "thermometer",
    "Thermometer T-7",
    {
        "maker": "Kvist Instruments (invented)",
        "type": "immersion probe",
        "serial": "KV-T-7702",
        "location": "Bench 2",
        "resolution": "0.1",
    },
    "NM-T-20466",
    _LAB,
    150,
    215,
    {"reading": {"unit": "Cel", "U": "0.2", "k": "2"}},
)
ROOM = Tool(
    "room monitor",
    "Room monitor R-1",
    {
        "maker": "Kvist Instruments (invented)",
        "type": "temperature, pressure, humidity",
        "serial": "KV-R-1009",
        "location": "Weighing room",
    },
    "NM-R-20471",
    _LAB,
    345,
    20,
    {
        "temperature": {"unit": "Cel", "U": "0.4", "k": "2"},
        "pressure": {"unit": "hPa", "U": "1.0", "k": "2"},
        "humidity": {"unit": "%", "half_width": "3", "shape": "rectangular"},
    },
)
TOOLS = (BALANCE, BURETTE, OLD_BURETTE, THERMOMETER, ROOM)

STANDARD_LOTS: Mapping[str, Mapping[str, Any]] = MappingProxyType(
    {
        "KHP": {
            "name": "KHP, lot PH-2291",
            "certificate_number": "PH-2291/1",
            "issuer": "Reference house Aldergate (invented)",
            "due_basis": "expiry on the certificate",
            "mass_fraction": {"value": "0.99986", "U": "0.00034", "k": "2"},
            "basis": "dried",
            "drying": "2 h at 120 °C, then in a desiccator",
            "drying_demand": {
                "low_C": "110",
                "high_C": "125",
                "hours": "2",
                "desiccator": True,
            },
            "minimum_sample_g": "0.1",
            "storage": "desiccator, weighing room",
            "received_g": "60.00",
            "period_after_opening": "12 months",
        },
        "TRIS": {
            "name": "TRIS, lot TM-0870",
            "certificate_number": "TM-0870/2",
            "issuer": "Reference house Aldergate (invented)",
            "due_basis": "expiry on the certificate",
            "mass_fraction": {"value": "0.99978", "U": "0.00044", "k": "2"},
            "basis": "as is",
            "minimum_sample_g": "0.1",
            "storage": "desiccator, weighing room",
            "received_g": "25.00",
            "period_after_opening": "9 months",
        },
    }
)

NAOH_RECIPE: Mapping[str, Any] = MappingProxyType(
    {
        "title": "Sodium hydroxide 0.1 mol/L against potassium hydrogen phthalate",
        "titrant": {"substance": "NaOH", "nominal": "0.1", "medium": "water"},
        "route": "weighed",
        "standard": "KHP",
        "weighing": "difference",
        "replicates": 6,
        "end_point": {"mode": "visual", "indicator": "phenolphthalein"},
        "valid_for": "visual, phenolphthalein",
        "blank": "indicator",
        "buoyancy": True,
        "temperature": "once",
        "interval_days": 14,
        "notice_days": 3,
        "steps": [
            {"key": "mixed", "label": "Lot mixed thoroughly", "when": "before"},
            {
                "key": "dried",
                "label": "KHP dried 2 h at 120 °C, cooled in the desiccator",
                "when": "before",
            },
        ],
    }
)
HCL_RECIPE: Mapping[str, Any] = MappingProxyType(
    {
        "title": "Hydrochloric acid 0.1 mol/L against TRIS",
        "titrant": {"substance": "HCl", "nominal": "0.1", "medium": "water"},
        "route": "weighed",
        "standard": "TRIS",
        "weighing": "tared",
        "replicates": 4,
        "end_point": {"mode": "visual", "indicator": "bromocresol green"},
        "valid_for": "visual, bromocresol green",
        "blank": "indicator",
        "buoyancy": True,
        "temperature": "each",
        "interval_days": 30,
        "notice_days": 7,
        "steps": [{"key": "mixed", "label": "Lot mixed thoroughly", "when": "before"}],
    }
)
PROBE_RECIPE: Mapping[str, Any] = MappingProxyType(
    {
        "title": "Sodium hydroxide 0.1 mol/L against potassium hydrogen phthalate, by probe",
        "titrant": {"substance": "NaOH", "nominal": "0.1", "medium": "water"},
        "route": "weighed",
        "standard": "KHP",
        "weighing": "difference",
        "replicates": 4,
        "end_point": {
            "mode": "potentiometric",
            "method": "model fit",
            "system": "khp-naoh",
            "flask_volume_mL": "50",
        },
        "valid_for": "potentiometric, model fit",
        "blank": "none",
        "buoyancy": True,
        "temperature": "once",
        "interval_days": 14,
        "notice_days": 3,
        "steps": [
            {"key": "mixed", "label": "Lot mixed thoroughly", "when": "before"},
            {
                "key": "dried",
                "label": "KHP dried 2 h at 120 °C, cooled in the desiccator",
                "when": "before",
            },
        ],
    }
)
PROBE_RECIPE_NAME = "NaOH 0.1 against KHP, by probe"
RECIPES: Mapping[str, Mapping[str, Any]] = MappingProxyType(
    {"NaOH 0.1 against KHP": NAOH_RECIPE, "HCl 0.1 against TRIS": HCL_RECIPE}
)
