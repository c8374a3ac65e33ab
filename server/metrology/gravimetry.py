"""Volumes by weighing water: V20 of each weighing, a run with its budget (ISO 4787, ISO 8655-6)."""

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from server.metrology.air import cipm_2007
from server.metrology.coverage import printed_factor
from server.metrology.glassware import volume_at_20, z_factor
from server.metrology.propagation import Input, propagate
from server.metrology.type_a import mean_of, standard_deviation
from server.metrology.water import air_saturation_change, density

COVERAGE = 0.95
#: Where Tanaka's equation holds; its air saturation term is stated for 0 to 25 °C.
WATER_RANGE_C = (0.0, 40.0)
#: Inputs of the budget by name: each is an error around zero, in the unit given here.
ERRORS: Mapping[str, tuple[str, str]] = {
    "weighing": ("weighing, two indications", "g"),
    "balance_errors": ("errors of the balance", "g"),
    "water_temperature": ("temperature of the water", "Cel"),
    "water_density": ("density of the water, relative", "1"),
    "air_temperature": ("temperature of the air", "Cel"),
    "air_pressure": ("pressure of the air", "hPa"),
    "air_humidity": ("humidity of the air", "%"),
    "glass_expansion": ("cubic expansion of the ware", "1/K"),
    "evaporation": ("evaporation", "g/min"),
}
REPEATABILITY = "repeatability"


@dataclass(frozen=True, slots=True)
class Air:
    """Air at the balance: temperature in °C, pressure in hPa, relative humidity in percent."""

    temperature: float
    pressure: float
    humidity: float


@dataclass(frozen=True, slots=True)
class WaterWeighing:
    """One weighing of water: net g as corrected, °C of the water, the air, minutes in the open."""

    net_g: float
    water_C: float
    air: Air
    minutes: float = 0.0


@dataclass(frozen=True, slots=True)
class Ware:
    """What holds for a whole run: the ware's γ per K, the water, evaporation in g/min."""

    glass_expansion: float
    air_saturated: bool
    evaporation_g_min: float = 0.0


@dataclass(frozen=True, slots=True)
class WeighedVolume:
    """A weighing's volume in mL at 20 °C, with the densities (kg/m³) and Z (mL/g) behind it."""

    net_g: float
    evaporated_g: float
    water_kg_m3: float
    air_kg_m3: float
    z_mL_g: float
    volume_mL: float


@dataclass(frozen=True, slots=True)
class BudgetLine:
    """One input of the mean's budget: u in its unit, |c·u| in mL, its share of u² in percent."""

    name: str
    source: str
    unit: str
    u: float
    dof: float | None
    contribution_mL: float
    share_percent: float


@dataclass(frozen=True, slots=True)
class Run:
    """The outcome of a run against a nominal volume, in mL at 20 °C.

    ``systematic_mL`` is mean − nominal; ``s_mL`` the random error of one delivery (None for one
    weighing), ``cv_percent`` the same over the mean. ``u_mL`` belongs to the mean.
    """

    nominal_mL: float
    volumes: tuple[WeighedVolume, ...]
    mean_mL: float
    systematic_mL: float
    s_mL: float | None
    cv_percent: float | None
    u_mL: float
    dof: float | None
    k: float
    budget: tuple[BudgetLine, ...]

    @property
    def systematic_percent(self) -> float:
        """The systematic error in percent of the nominal volume (ISO 8655-6)."""
        return 100.0 * self.systematic_mL / self.nominal_mL

    @property
    def U_mL(self) -> float:
        """Expanded uncertainty of the mean with the printed coverage factor, mL."""
        return self.k * self.u_mL


def water_density(temperature: Any, *, air_saturated: bool) -> Any:
    """Return the density of water in kg/m³ at ``temperature`` in °C, air-saturated or degassed."""
    found = density(temperature)
    return found + air_saturation_change(temperature) if air_saturated else found


def weighed_volume(one: WaterWeighing, ware: Ware) -> WeighedVolume:
    """Return V20 = (m + e·t)·Z·(1 − γ(t_w − 20)) of one weighing, in mL (ISO 4787)."""
    water = water_density(one.water_C, air_saturated=ware.air_saturated)
    air = cipm_2007(one.air.temperature, one.air.pressure, one.air.humidity)
    z = z_factor(water, air)
    evaporated = ware.evaporation_g_min * one.minutes
    volume = volume_at_20(
        one.net_g + evaporated,
        z,
        glass_expansion=ware.glass_expansion,
        temperature=one.water_C,
    )
    return WeighedVolume(
        net_g=one.net_g,
        evaporated_g=evaporated,
        water_kg_m3=float(water),
        air_kg_m3=float(air),
        z_mL_g=float(z),
        volume_mL=float(volume),
    )


def evaluate_run(
    weighings: Sequence[WaterWeighing],
    ware: Ware,
    *,
    nominal_mL: float,
    errors: Sequence[Input] = (),
    repeatability: tuple[float, float] | None = None,
) -> Run:
    """Return a run's mean, errors and budget.

    ``errors`` are inputs around zero, named as in ``ERRORS`` and common to all weighings;
    ``repeatability`` (s of one delivery in mL, its dof) goes before the run's own s.

    Raises:
        ValueError: one weighing, and nothing that tells the repeatability.
    """
    volumes = tuple(weighed_volume(one, ware) for one in weighings)
    values = [one.volume_mL for one in volumes]
    s = standard_deviation(values)
    counted = repeatability or (None if s is None else (s, float(len(values) - 1)))
    if counted is None:
        says = "One weighing tells nothing about the repeatability: weigh again."
        raise ValueError(says)
    spread = Input(
        name=REPEATABILITY,
        value=0.0,
        u=counted[0] / math.sqrt(len(values)),
        dof=counted[1],
        unit="mL",
        shared=False,
    )
    inputs = [one for one in (*errors, spread) if one.u > 0]
    found = propagate(lambda x: _mean_volume(weighings, ware, x), inputs)
    mean = mean_of(values)
    return Run(
        nominal_mL=nominal_mL,
        volumes=volumes,
        mean_mL=mean,
        systematic_mL=mean - nominal_mL,
        s_mL=s,
        cv_percent=None if s is None else 100.0 * s / mean,
        u_mL=found.u,
        dof=found.dof,
        k=printed_factor(found.dof, COVERAGE),
        budget=tuple(_line(one, found.contributions[one.name], found.u) for one in inputs),
    )


def _mean_volume(weighings: Sequence[WaterWeighing], ware: Ware, x: Mapping[str, Any]) -> Any:
    """Return the mean V20 in mL with every common error moved as ``x`` says."""
    total = sum(_moved_volume(one, ware, x) for one in weighings)
    return total / len(weighings) + x.get(REPEATABILITY, 0.0)


def _moved_volume(one: WaterWeighing, ware: Ware, x: Mapping[str, Any]) -> Any:
    def error(name: str) -> Any:
        return x.get(name, 0.0)

    water_C = one.water_C + error("water_temperature")
    water = water_density(water_C, air_saturated=ware.air_saturated)
    air = cipm_2007(
        one.air.temperature + error("air_temperature"),
        one.air.pressure + error("air_pressure"),
        one.air.humidity + error("air_humidity"),
    )
    z: Any = z_factor(water * (1.0 + error("water_density")), air)
    mass = one.net_g + (ware.evaporation_g_min + error("evaporation")) * one.minutes
    mass += error("weighing") + error("balance_errors")
    expansion = ware.glass_expansion + error("glass_expansion")
    return volume_at_20(mass, z, glass_expansion=expansion, temperature=water_C)


def _line(one: Input, contribution: float, u: float) -> BudgetLine:
    source, unit = ERRORS.get(one.name, (one.name, one.unit or ""))
    return BudgetLine(
        name=one.name,
        source=source,
        unit=unit,
        u=one.u,
        dof=one.dof,
        contribution_mL=abs(contribution),
        share_percent=100.0 * contribution**2 / u**2 if u > 0 else 0.0,
    )
