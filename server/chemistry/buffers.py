"""Standard buffers: pH by named set and temperature."""

import json
import math
from collections.abc import Mapping
from dataclasses import dataclass
from decimal import Decimal
from functools import lru_cache
from itertools import pairwise
from typing import Any

from server.files import find_folder


class NoBuffer(LookupError):
    """No table has this buffer: ``says`` names what is there, ``about`` the fact to change."""

    def __init__(self, says: str, about: str) -> None:
        super().__init__(says)
        self.says = says
        self.about = about


@dataclass(frozen=True, slots=True)
class BufferPH:
    """A buffer's pH at a temperature in °C; ``u`` is what the table's last digit leaves."""

    set_name: str
    buffer: str
    temperature_C: float
    pH: float
    u: float
    source: str
    provenance: str


@lru_cache(maxsize=1)
def buffer_sets() -> Mapping[str, Any]:
    """Return the sets that come with the program, by name."""
    text = (find_folder("seed_data") / "buffers.json").read_text(encoding="utf-8")
    held: dict[str, Any] = json.loads(text)["sets"]
    return held


def buffer_names(set_name: str) -> tuple[str, ...]:
    """Return the buffers of a set.

    Raises:
        NoBuffer: there is no such set.
    """
    return tuple(_set(set_name)["buffers"])


def buffer_pH(set_name: str, buffer: str, temperature_C: float) -> BufferPH:
    """Return a buffer's pH, linear between the temperatures of its table.

    u is that of a printed digit's rounding, half a unit rectangular; the buffer's own certificate
    goes before it.

    Raises:
        NoBuffer: the set, the buffer or the temperature is in no table.
    """
    held = _set(set_name)
    if buffer not in held["buffers"]:
        says = f"{set_name} has no buffer “{buffer}”; it has {', '.join(held['buffers'])}."
        raise NoBuffer(says, "buffer")
    rows = [
        (float(t), float(Decimal(value)))
        for t, value in zip(held["t_C"], held["buffers"][buffer], strict=True)
        if value is not None
    ]
    if not rows[0][0] <= temperature_C <= rows[-1][0]:
        says = (
            f"{set_name} states {buffer} from {rows[0][0]:g} to {rows[-1][0]:g} °C, "
            f"not at {temperature_C:g} °C."
        )
        raise NoBuffer(says, "temperature")
    return BufferPH(
        set_name=set_name,
        buffer=buffer,
        temperature_C=temperature_C,
        pH=_between(rows, temperature_C),
        u=0.5 * 10.0 ** -int(held["decimals"]) / math.sqrt(3.0),
        source=held["source"],
        provenance=held["provenance"],
    )


def _set(name: str) -> Mapping[str, Any]:
    sets = buffer_sets()
    if name not in sets:
        raise NoBuffer(f"There is no set “{name}”; there are {', '.join(sets)}.", "set")
    found: Mapping[str, Any] = sets[name]
    return found


def _between(rows: list[tuple[float, float]], t: float) -> float:
    for (low, first), (high, second) in pairwise(rows):
        if low <= t <= high:
            return first + (second - first) * (t - low) / (high - low)
    return rows[-1][1]
