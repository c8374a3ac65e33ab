"""Standard atomic weights with their uncertainty."""

import math
from collections.abc import Mapping
from dataclasses import dataclass
from types import MappingProxyType

#: The set that every result names; values from another set differ by up to 90 ppm (sulfur).
SET_NAME = "CIAAW 2021 standard atomic weights, midpoints of intervals"


@dataclass(frozen=True, slots=True)
class AtomicWeight:
    """A standard atomic weight and its half-width, taken as rectangular."""

    value: float
    half_width: float

    @property
    def u(self) -> float:
        """Standard uncertainty (van der Veen et al., Pure Appl. Chem. 93 (2021) 629-646)."""
        return self.half_width / math.sqrt(3.0)


def _interval(low: float, high: float) -> AtomicWeight:
    return AtomicWeight(0.5 * (low + high), 0.5 * (high - low))


#: CIAAW, Standard Atomic Weights 2021. Barium and cerium are from memory.
ATOMIC_WEIGHTS: Mapping[str, AtomicWeight] = MappingProxyType(
    {
        "H": _interval(1.00784, 1.00811),
        "B": _interval(10.806, 10.821),
        "C": _interval(12.0096, 12.0116),
        "N": _interval(14.00643, 14.00728),
        "O": _interval(15.99903, 15.99977),
        "Na": AtomicWeight(22.98976928, 2e-8),
        "Mg": _interval(24.304, 24.307),
        "S": _interval(32.059, 32.076),
        "Cl": _interval(35.446, 35.457),
        "K": AtomicWeight(39.0983, 1e-4),
        "Ca": AtomicWeight(40.078, 4e-3),
        "Cr": AtomicWeight(51.9961, 6e-4),
        "Mn": AtomicWeight(54.938043, 2e-6),
        "Fe": AtomicWeight(55.845, 2e-3),
        "Zn": AtomicWeight(65.38, 2e-2),
        "As": AtomicWeight(74.921595, 6e-6),
        "Br": _interval(79.901, 79.907),
        "Ag": AtomicWeight(107.8682, 2e-4),
        "I": AtomicWeight(126.90447, 3e-5),
        "Ba": AtomicWeight(137.327, 7e-3),
        "Ce": AtomicWeight(140.116, 1e-3),
    }
)
