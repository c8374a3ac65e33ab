"""Standardization, version 1: the measurement model, from inputs to the mean concentration."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from server.evaluation.bench_record import BenchRecord
from server.evaluation.constants import Constants
from server.evaluation.reference_fields import Reference
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
    ``by_drops``: drops were counted, no burette was read. ``minutes``: how long a drift acted.
    """

    mass_g: float | None
    read_mL: float | None
    segments: int
    temperature_C: float
    from_curve: bool = False
    holds_blank: bool = False
    by_drops: bool = False
    minutes: float = 0.0


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
        minutes=one.minutes or 0.0,
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
        self.back_ratio = constants.back_ratio_value
        self.values = dict(values)
        self.temperature = liquid_temperature(record)
        # sign of each root that the reference brings; its size is the input's uncertainty
        dose = record.back.dose if record.back else None
        self.roots = _signed_roots(record.reference, "reference")
        self.added_roots = _signed_roots(dose.reference if dose else None, "added")

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
        """Return the amount of titrant in mmol that a replicate's standard stands for.

        In a back titration it is the titrant pipetted. A mass titre has mg, see ``mass_mg``.
        """
        x, volume = self.values, self.volume(portion)
        if self.record.route == "back":
            return self.concentration(portion) * float(self._pipetted(x))
        if self.record.unknown_in == "flask" and self.record.route == "against-titrant":
            return float(self.ratio * self._reference(x) * volume)
        return self.concentration(portion) * volume

    def mass_mg(self, portion: Portion) -> float:
        """Return the mg of the substance that a mass titre's replicate held, drift included."""
        return float(self._mass_mg(portion, self.values))

    def portion(self, one: Replicate) -> Portion:
        """Return a replicate's readings in figures."""
        return portion_of(self.record, one)

    def standard_mmol(self, portion: Portion) -> float | None:
        """Return the amount of standard in the flask in mmol, None where it is the unknown."""
        record = self.record
        if record.route == "against-titrant" and record.unknown_in == "flask":
            return None
        if record.route in {"back", "mass-titre"}:
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
        if self.record.route == "mass-titre":
            return self._mass_mg(portion, x) / volume
        if self.record.back is not None:
            return self._of_back(portion, x, volume) / delivered
        if self.record.route == "against-titrant" and self.record.unknown_in == "flask":
            return self.ratio * volume * delivered
        return self.ratio * delivered / volume

    def _mass_mg(self, portion: Portion, x: Mapping[str, Number]) -> Number:
        """Return the mg of substance that the titrant met: 1000·m·B·w + drift·minutes/1000."""
        mass = portion.mass_g + x["linearity"] + x["balance_errors"]
        drifted = x["drift"] * (portion.minutes + x["timing"]) / 1000.0
        return 1000.0 * mass * self._buoyancy(x) * x["mass_fraction"] + drifted

    def _of_back(self, portion: Portion, x: Mapping[str, Number], volume: Number) -> Number:
        """Return the mmol of titrant that a back titration found, of the pipetted volume.

        Excess to the standard: n = r·1000·m·B·w/M + q·c_ref·V, what the standard took and what
        came back. Excess to the unknown: n = r·(c_add·V_add·F_add − q·c_ref·V), or
        n = r·q·c_ref·(V_zero − V) where the blank sets the zero.
        """
        back = self.record.back
        came_back = self.back_ratio * self._reference(x) * volume
        if back is not None and back.excess_to == "standard":
            mass = portion.mass_g + x["linearity"] + x["balance_errors"]
            return self.ratio * 1000.0 * mass * self._amount_per_gram(x) + came_back
        return self.ratio * (self._excess(x) - came_back)

    def _excess(self, x: Mapping[str, Number]) -> Number:
        """Return the mmol of the excess that was added to the unknown."""
        dose = self.record.back.dose if self.record.back else None
        if dose is None:
            own = self._own_temperature(None, x)
            factor = self._factor(own, self.record.burette.glass_expansion, x)
            zero = (x["zero"] + x["delivery"]) * factor
            return self.back_ratio * self._reference(x) * zero
        own = self._own_temperature(dose.temperature, x)
        volume = x["added_delivery"] * self._factor(own, dose.glass_expansion, x)
        return _moved(x["added"], self.added_roots, x) * volume

    def came_back(self, portion: Portion) -> float:
        """Return the part of the excess that a back titration found again, of 1."""
        x, record = self.values, self.record
        found = float(self.back_ratio * self._reference(x)) * self.volume(portion)
        if record.back is not None and record.back.excess_to == "standard":
            return found / self.amount(portion)
        return found / float(self._excess(x))

    def _delivered(self, x: Mapping[str, Number]) -> Number:
        """Return what all replicates have in common of the standard.

        weighed: mol of standard per g weighed; aliquot and unknown in the burette: mmol pipetted;
        unknown in the flask: mol/L of the reference per mL pipetted; back: mL of titrant pipetted,
        at 20 °C; mass titre: nothing.
        """
        if self.record.route == "mass-titre":
            return 1.0
        if self.record.route == "weighed":
            return self._amount_per_gram(x)
        pipetted = self._pipetted(x)
        if self.record.route == "back":
            return pipetted
        if self.record.route == "aliquot":
            return self._solution(x) * pipetted
        if self.record.unknown_in == "flask":
            return self._reference(x) / pipetted
        return self._reference(x) * pipetted

    def _pipetted(self, x: Mapping[str, Number]) -> Number:
        """Return the mL pipetted, at 20 °C."""
        pipette = self.record.pipette
        if pipette is None:
            raise ValueError("this route needs a pipette")
        own = self._own_temperature(pipette.temperature, x)
        return x["pipette"] * self._factor(own, pipette.glass_expansion, x)

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
        return _moved(x["reference"], self.roots, x)

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


def component_name(index: int, of: str = "reference") -> str:
    """Return the input's name of a root that the reference, or the excess added, brings."""
    return f"{of}_root_{index}"


def _signed_roots(reference: Reference | None, of: str) -> list[tuple[str, float]]:
    components = reference.components if reference else ()
    return [
        (component_name(i, of), -1.0 if one.relative < 0 else 1.0)
        for i, one in enumerate(components)
    ]


def _moved(value: Number, roots: Sequence[tuple[str, float]], x: Mapping[str, Number]) -> Number:
    """Return a concentration in mol/L, moved by the roots it brings."""
    return value * (1.0 + sum(sign * x[name] for name, sign in roots))
