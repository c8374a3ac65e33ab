"""What the demo laboratory calibrated itself, reading by reading. All of it is invented."""

from collections.abc import Mapping, Sequence
from types import MappingProxyType
from typing import Any

from server.demo.cast import Tool

_AIR = {"temperature": "21.2", "pressure": "1008.6", "humidity": "47"}


def _weighings(keys: Sequence[str], rows: Sequence[str]) -> list[dict[str, str]]:
    return [dict(zip(keys, row.split(), strict=True)) for row in rows]


#: Water delivered by the piston burette P-25 to each of five readings, three times.
BURETTE_RUN: Mapping[str, Any] = MappingProxyType(
    {
        "kind": "piston burette",
        "nominal": "25",
        "water": "air-saturated",
        "glass_expansion": "9.9e-6",
        "air": _AIR,
        "rule": "simple acceptance",
        "weighings": _weighings(
            ("point", "before", "after", "water"),
            (
                "5.00 31.7958 36.7844 21.0", "5.00 31.2590 36.2478 21.2",
                "5.00 31.6239 36.6143 21.1", "10.00 31.3235 41.2983 21.0",
                "10.00 31.8662 41.8415 21.1", "10.00 31.8601 41.8370 21.2",
                "15.00 31.3042 46.2627 21.3", "15.00 31.2683 46.2258 21.1",
                "15.00 31.8609 46.8168 21.1", "20.00 31.2696 51.2058 21.2",
                "20.00 31.7707 51.7058 21.1", "20.00 31.4930 51.4312 21.2",
                "25.00 31.8105 56.7271 21.2", "25.00 31.7404 56.6604 21.1",
                "25.00 31.7061 56.6248 21.0",
            ),
        ),
    }
)  # fmt: skip
PIPETTE_RUN: Mapping[str, Any] = MappingProxyType(
    {
        "kind": "pipette",
        "nominal": "10",
        "class": "A",
        "water": "air-saturated",
        "glass_expansion": "9.9e-6",
        "air": _AIR,
        "rule": "simple acceptance",
        "weighings": _weighings(
            ("before", "after", "water"),
            (
                "28.4094 38.3835 21.2", "28.5395 38.5150 21.2", "28.5193 38.4935 21.2",
                "28.6707 38.6450 21.1", "28.7058 38.6792 21.1", "28.5067 38.4799 21.3",
                "28.4950 38.4718 21.2", "28.6190 38.5915 21.2", "28.7494 38.7229 21.1",
                "28.7690 38.7414 21.3",
            ),
        ),
    }
)  # fmt: skip
PIPETTE = Tool(
    "pipette",
    "Pipette V-10",
    {
        "maker": "Glashafen Works (invented)",
        "type": "single mark, 10 mL, class A",
        "serial": "GH-10-552",
        "location": "Bench 2",
        "capacity": "10",
        "software": "not applicable: glass",
        "adjustments": "not applicable: a mark on glass is not adjusted",
    },
    "TB-G-0094",
    "own gravimetric calibration (ISO 4787)",
    119,
    246,
    {},
)
PROBE = Tool(
    "probe",
    "Probe E-3",
    {
        "maker": "Kvist Instruments (invented)",
        "type": "combined glass electrode",
        "serial": "KV-E-3310",
        "location": "Bench 1",
        "software": "not applicable: no electronics of its own",
        "references": "buffers of the set, bottles opened this month",
    },
    "",
    "own calibration in buffers",
    2,
    5,
    {},
)
PROBE_RUN: Mapping[str, Any] = MappingProxyType(
    {
        "set": "JIS Z 8802:2011",
        "buffers": [
            {"buffer": "phthalate", "temperature": "24.6", "mV": "172.4"},
            {"buffer": "phosphate", "temperature": "24.6", "mV": "5.9"},
            {"buffer": "borate", "temperature": "24.7", "mV": "-129.2"},
        ],
        "uncertainty": {
            "reading": {"unit": "mV", "half_width": "0.3", "shape": "rectangular"},
            "temperature": {"unit": "Cel", "U": "0.2", "k": "2"},
        },
    }
)
FLASK = Tool(
    "flask",
    "Flask F-1000",
    {
        "maker": "Glashafen Works (invented)",
        "type": "one mark, 1000 mL, class A",
        "serial": "GH-1000-18",
        "location": "Bench 2",
        "capacity": "1000",
        "software": "not applicable: glass",
        "adjustments": "not applicable: a mark on glass is not adjusted",
    },
    "",
    "",
    119,
    246,
    {},
)
#: The daily check of the balance: ten first readings, then how far later ones lie off, in 0.1 mg.
CHECK_WEIGHT = "100 g, W-3"
FIRST_READINGS = (
    "100.0001", "100.0002", "100.0001", "100.0000", "100.0001",
    "100.0002", "100.0001", "100.0001", "100.0000", "100.0002",
)  # fmt: skip
CHECK_CENTRE_G, CHECK_STEPS = "100.0001", (0, 1, -1, 0, 1, 0, -1, 1, 0, 0, -1, 1)
#: The day, counted back, on which a check lay beyond warning; the next one held again.
DAY_OF_THE_CRUMB = 33
