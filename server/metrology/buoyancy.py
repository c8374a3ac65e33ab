"""Air buoyancy in weighing."""

from typing import Any

#: Conventional density of weights in kg/m³ (OIML D 28).
WEIGHTS = 8000.0


def factor(air: Any, density_g_cm3: Any, *, weights: float = WEIGHTS) -> Any:
    """Return B = (1 − ρa/ρw)/(1 − ρa/ρs), by which a balance's reading becomes a mass.

    ``air`` and ``weights`` in kg/m³, the sample's density in g/cm³.
    """
    return (1.0 - air / weights) / (1.0 - air / (1000.0 * density_g_cm3))
