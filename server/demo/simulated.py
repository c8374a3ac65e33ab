"""Readings as a careful person would make them, simulated with a fixed seed."""

from dataclasses import dataclass
from random import Random

#: Molar mass g/mol and density g/cm3; only the readings are made of these, never a result.
_STANDARDS = {"KHP": (204.2206, 1.636), "TRIS": (121.1352, 1.33)}
_RELATIVE_SCATTER = 0.0004
_BLANK_ML = 0.02

#: Replicate (0 is the sheet), slot and text.
Line = tuple[int, str, str]


@dataclass(frozen=True, slots=True)
class Truth:
    """What the simulated bench is made of: concentration at 20 °C and the day's conditions."""

    standard: str
    mol_per_L: float
    celsius: float = 20.6
    mass_fraction: float = 0.9998


def sheet_lines(truth: Truth, *, each_temperature: bool, drying: str | None) -> list[Line]:
    """Return the entries that hold for the whole sheet."""
    indicator = "phenolphthalein" if truth.standard == "KHP" else "bromocresol green"
    lines = [(0, "step:mixed", "done")]
    if drying:
        lines.append((0, "step:dried", drying))
    lines.append((0, "indicator", indicator))
    if not each_temperature:
        lines.append((0, "temperature", f"{truth.celsius:.1f}"))
    return [
        *lines,
        (0, "air_temperature", f"{truth.celsius + 0.3:.1f}"),
        (0, "air_pressure", "1008.6"),
        (0, "air_humidity", "47"),
        (0, "blank", f"{_BLANK_ML:.2f}"),
    ]


def amount_of(truth: Truth, masses: list[Line]) -> float:
    """Return the amount in mmol that two weighings, container with and without, have taken."""
    before, after = (float(text) for _, _, text in masses)
    return _amount(truth, before - after)


def _amount(truth: Truth, mass_g: float) -> float:
    molar_mass, density = _STANDARDS[truth.standard]
    buoyancy = (1 - 1.19e-3 / 8.0) / (1 - 1.19e-3 / density)
    return 1000 * mass_g * truth.mass_fraction * buoyancy / molar_mass


def replicate_lines(
    truth: Truth, replicate: int, random: Random, *, tared: bool, off_percent: float = 0.0
) -> list[Line]:
    """Return the entries of one replicate; ``off_percent`` makes its volume wrong by as much."""
    molar_mass, _ = _STANDARDS[truth.standard]
    target = truth.mol_per_L * random.uniform(0.0185, 0.0212) * molar_mass
    mass = round(target, 4)
    amount_mmol = _amount(truth, mass)
    volume = amount_mmol / truth.mol_per_L * random.gauss(1.0, _RELATIVE_SCATTER)
    volume = volume * (1 + off_percent / 100) + _BLANK_ML
    start = random.choice((0.00, 0.02, 0.05, 0.10))
    if tared:
        lines = [
            (replicate, "tare_load", f"{random.uniform(24.8, 25.4):.4f}"),
            (replicate, "mass", f"{mass:.4f}"),
        ]
    else:
        container = round(random.uniform(18.2, 18.9), 4)
        lines = [
            (replicate, "container_and_standard", f"{container + mass:.4f}"),
            (replicate, "container_less_standard", f"{container:.4f}"),
        ]
    lines += [
        (replicate, "burette_start", f"{start:.2f}"),
        (replicate, "burette_end", f"{start + volume:.2f}"),
    ]
    if tared:
        lines.append((replicate, "temperature", f"{truth.celsius + random.gauss(0, 0.1):.1f}"))
    return lines
