"""Standardization, version 1: the measurement model, from inputs to the mean concentration."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from server.evaluation.bench_record import BenchRecord
from server.evaluation.constants import Constants
from server.evaluation.replicate_reading import Replicate
from server.metrology.air import cipm_2007
from server.metrology.buoyancy import factor as buoyancy_factor
from server.metrology.glassware import interpolate_error, volume_factor

REFERENCE_TEMPERATURE_C = 20.0
WEIGHTS_KG_M3 = 8000.0

# A float in first order, an array of trials in Monte Carlo.
Number = Any


@dataclass(frozen=True, slots=True)
class Portion:
    """One replicate in figures: g of standard, mL read, fillings, °C of the titrant.

    ``from_curve``: the volume is an end point found on a curve; ``holds_blank``: the way in which
    it was found counts the carbonate of the flask's water, so that no blank of it is taken off;
    ``by_drops``: drops were counted, no burette was read.
    """

    mass_g: float | None
    read_mL: float | None
    segments: int
    temperature_C: float
    from_curve: bool = False
    holds_blank: bool = False
    by_drops: bool = False


def portion_of(record: BenchRecord, one: Replicate) -> Portion:
    """Return a replicate's readings, corrected by the error tables of balance and burette."""
    temperature = one.temperature if one.temperature is not None else liquid_temperature(record)
    drops = one.curve is not None and one.curve.drop is not None
    return Portion(
        mass_g=_mass(record, one),
        read_mL=_read_volume(record, one),
        segments=0 if drops else max(1, len(one.segments)),
        temperature_C=temperature,
        from_curve=one.end_point is not None,
        holds_blank=_holds_blank(record, one),
        by_drops=drops,
    )


def _holds_blank(record: BenchRecord, one: Replicate) -> bool:
    """Return whether the end point is free of what a reagent blank would take off."""
    kind = record.blank.kind if record.blank else None
    return kind == "reagent" and one.end_point is not None and one.end_point.holds_blank


def liquid_temperature(record: BenchRecord) -> float:
    """Return the record's temperature of the liquids, 20 °C where it states none."""
    stated = record.temperature
    return REFERENCE_TEMPERATURE_C if stated is None or stated.value is None else stated.value


def _mass(record: BenchRecord, one: Replicate) -> float | None:
    """Return m = a + e(a) − b − e(b) in g; a tare is an indication like any other."""
    table = record.balance.error_table if record.balance else ()

    def error(load: float) -> float:
        return interpolate_error(table, load) if table else 0.0

    if one.difference is not None:
        first, second = one.difference
        return first + error(first) - second - error(second)
    if one.tared is not None:
        mass, tare = one.tared
        return mass + error(tare + mass) - error(tare)
    return None


def _read_volume(record: BenchRecord, one: Replicate) -> float | None:
    """Return the sum over the segments of end + e(end) − start − e(start), in mL."""
    if one.delivered is not None:
        return one.delivered
    if not one.segments:
        return None
    table = record.burette.error_table

    def corrected(reading: float) -> float:
        return reading + (interpolate_error(table, reading) if table else 0.0)

    return sum(corrected(end) - corrected(start) for start, end in one.segments)


class Model:
    """c of each replicate and of their mean, as a function of the inputs by name.

    ``values`` holds every input's estimate; a call may put others, or arrays of trials, in their
    place. One error of the thermometer moves all temperatures of the liquids together.
    """

    def __init__(
        self, record: BenchRecord, constants: Constants, values: Mapping[str, float]
    ) -> None:
        self.record = record
        self.ratio = constants.ratio_value
        self.values = dict(values)
        self.temperature = liquid_temperature(record)
        # sign of each root that the reference brings; its size is the input's uncertainty
        components = record.reference.components if record.reference else ()
        self.roots = [
            (component_name(i), -1.0 if one.relative < 0 else 1.0)
            for i, one in enumerate(components)
        ]

    def mean(self, portions: Sequence[Portion], inputs: Mapping[str, Number]) -> Number:
        """Return the mean concentration in mol/L, with the factors that count once."""
        x = {**self.values, **inputs}
        delivered = self._delivered(x)
        total = sum(self._concentration(one, x, delivered) for one in portions)
        return total / len(portions) * x["repeatability"] * x["between_days"]

    def concentration(self, portion: Portion) -> float:
        """Return one replicate's concentration in mol/L at the inputs' estimates."""
        x = self.values
        return float(self._concentration(portion, x, self._delivered(x)))

    def volume(self, portion: Portion) -> float:
        """Return the burette's volume in mL at 20 °C, less blank and excess."""
        return float(self._volume(portion, self.values))

    def amount(self, portion: Portion) -> float:
        """Return the amount of titrant in mmol that a replicate's standard stands for."""
        x, volume = self.values, self.volume(portion)
        if self.record.unknown_in == "flask" and self.record.route == "against-titrant":
            return float(self.ratio * self._reference(x) * volume)
        return self.concentration(portion) * volume

    def portion(self, one: Replicate) -> Portion:
        """Return a replicate's readings in figures."""
        return portion_of(self.record, one)

    def standard_mmol(self, portion: Portion) -> float | None:
        """Return the amount of standard in the flask in mmol, None where it is the unknown."""
        record = self.record
        if record.route == "against-titrant" and record.unknown_in == "flask":
            return None
        x = self.values
        if record.route != "weighed":
            return float(self._delivered(x))
        if portion.mass_g is None:
            return None
        mass = portion.mass_g + x["linearity"] + x["balance_errors"]
        return float(1000.0 * mass * self._delivered(x))

    def _concentration(
        self, portion: Portion, x: Mapping[str, Number], delivered: Number
    ) -> Number:
        volume = self._volume(portion, x)
        if self.record.route == "weighed":
            mass = portion.mass_g + x["linearity"] + x["balance_errors"]
            return self.ratio * 1000.0 * mass * delivered / volume
        if self.record.route == "against-titrant" and self.record.unknown_in == "flask":
            return self.ratio * volume * delivered
        return self.ratio * delivered / volume

    def _delivered(self, x: Mapping[str, Number]) -> Number:
        """Return what all replicates have in common of the standard.

        weighed: mol of standard per g weighed; aliquot and unknown in the burette: mmol pipetted;
        unknown in the flask: mol/L of the reference per mL pipetted.
        """
        if self.record.route == "weighed":
            return self._amount_per_gram(x)
        pipette = self.record.pipette
        if pipette is None:
            raise ValueError("this route needs a pipette")
        own = self._own_temperature(pipette.temperature, x)
        pipetted = x["pipette"] * self._factor(own, pipette.glass_expansion, x)
        if self.record.route == "aliquot":
            return self._solution(x) * pipetted
        if self.record.unknown_in == "flask":
            return self._reference(x) / pipetted
        return self._reference(x) * pipetted

    def _solution(self, x: Mapping[str, Number]) -> Number:
        """Return the standard solution's concentration in mol/L at 20 °C."""
        solution = self.record.solution
        if solution is None or solution.flask is None:
            return x["solution"]
        own = self._own_temperature(solution.flask.temperature, x)
        made_up = x["flask"] * self._factor(own, solution.flask.glass_expansion, x)
        return 1000.0 * x["solution_mass"] * self._amount_per_gram(x) / made_up

    def _reference(self, x: Mapping[str, Number]) -> Number:
        """Return the reference titrant's concentration in mol/L, moved by the roots it brings."""
        return x["reference"] * (1.0 + sum(sign * x[name] for name, sign in self.roots))

    def _amount_per_gram(self, x: Mapping[str, Number]) -> Number:
        """Return B·w/M in mol/g."""
        return self._buoyancy(x) * x["mass_fraction"] / x["molar_mass"]

    def _buoyancy(self, x: Mapping[str, Number]) -> Number:
        if not self.record.buoyancy:
            return 1.0
        air = cipm_2007(x["air_temperature"], x["air_pressure"], x["air_humidity"])
        return buoyancy_factor(air, x["density"], weights=WEIGHTS_KG_M3)

    def _volume(self, portion: Portion, x: Mapping[str, Number]) -> Number:
        temperature = self._own_temperature(portion.temperature_C, x)
        factor = self._factor(temperature, self.record.burette.glass_expansion, x)
        read = portion.read_mL + portion.segments * x["delivery"]
        if portion.by_drops:
            read = read * x["drop"]
        if portion.from_curve:
            read = read + x["end_point"] + x["end_point_own"]
        if portion.holds_blank:
            return read * factor - x["excess"]
        return read * factor - x["blank"] - x["excess"]

    def _own_temperature(self, own: float | None, x: Mapping[str, Number]) -> Number:
        """Return a liquid's own temperature, moved by the thermometer's common error."""
        error = x["temperature"] - self.temperature
        return (self.temperature if own is None else own) + error

    def _factor(self, temperature: Number, glass: float, x: Mapping[str, Number]) -> Number:
        return volume_factor(temperature, glass, x["liquid_expansion"])


def component_name(index: int) -> str:
    """Return the input's name of a root that the reference brings."""
    return f"reference_root_{index}"
