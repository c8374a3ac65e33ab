"""The volume of a burette's drop, from weighings of many drops each."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from server.lab.calibration.run import UsedInstrument, with_instruments
from server.lab.calibration.typed_numbers import as_text
from server.lab.calibration.ware_verdict import drop_volume
from server.lab.calibration.water_run import read_water_run
from server.lab.refusal import Unacceptable

_KEYS = ("water", "glass_expansion", "air", "weighings", "evaporation", "uncertainty")


@dataclass(frozen=True, slots=True)
class Drop:
    """A drop's volume at 20 °C in mL with its u, as text, and how often it was weighed."""

    volume_text: str
    u_text: str
    weighings: int


def judge_drop(
    document: Mapping[str, Any], drops: int, used: Sequence[UsedInstrument] = ()
) -> Drop:
    """Return the volume of one drop from weighings of so many drops.

    The document's keys are those of a gravimetric run without ware: a drop has no class.

    Raises:
        Unacceptable: an unknown key, a value that cannot be taken, fewer than two weighings.
    """
    unknown = sorted(set(document) - set(_KEYS))
    if unknown:
        says = f"{unknown[0]} is not known here; known are {', '.join(_KEYS)}."
        raise Unacceptable(says, field=unknown[0])
    # a volume without marks or class, weighed like that of a pipette
    ware = {"kind": "pipette", "nominal": "1", "class": "A"}
    run = read_water_run({**with_instruments(document, used), **ware})
    volume, u = drop_volume(run, drops)
    return Drop(as_text(volume), as_text(u), len(run.counting))
