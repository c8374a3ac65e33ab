"""Calibration of a balance with weights: errors with u, hysteresis, repeatability, eccentricity."""

import math
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

from server.metrology.error_curve import bend_between
from server.metrology.type_a import mean_of, standard_deviation

#: USP <41>: 2·s/m ≤ 0.10 %, where s is not taken below 0.41 d.
USP_41_FACTOR, USP_41_LEAST_S = 2000.0, 0.41
#: Conventional density of air in kg/m³, at which conventional mass is stated (OIML D 28).
CONVENTIONAL_AIR = 1.2


@dataclass(frozen=True, slots=True)
class WeightReading:
    """A weight on the pan, in g: conventional value with u, readings going up and coming down."""

    conventional_g: float
    u_g: float
    up_g: float
    down_g: float | None = None

    @property
    def indication_g(self) -> float:
        """The mean of the readings up and down."""
        return self.up_g if self.down_g is None else 0.5 * (self.up_g + self.down_g)


@dataclass(frozen=True, slots=True)
class ErrorAtLoad:
    """At an indication in g: the error of indication (I − m_c), what to add to it, and its u.

    ``hysteresis_g`` is up − down, None where the load was not read coming down.
    """

    indication_g: float
    error_g: float
    correction_g: float
    hysteresis_g: float | None
    u_g: float
    dof: float | None


@dataclass(frozen=True, slots=True)
class WeighingCalibration:
    """A balance's errors at rising loads, in g.

    ``error_u_g`` is the largest u of the table, ``linearity_g`` the half-width (rectangular) of
    what the table leaves in one reading: half a step of the scale, half the hysteresis, and the
    bend between two loads.
    """

    errors: tuple[ErrorAtLoad, ...]
    s_g: float
    s_dof: int
    largest_hysteresis_g: float
    interpolation_g: float
    error_u_g: float
    error_u_dof: float | None
    linearity_g: float


def calibrate_balance(
    weights: Sequence[WeightReading],
    repeated_g: Sequence[float],
    *,
    step_g: float,
    air_kg_m3: float | None = None,
    weights_density: tuple[float, float] = (8000.0, 0.0),
) -> WeighingCalibration:
    """Return the errors of indication E = I − m_c with their uncertainties.

    ``repeated_g`` are at least five readings of one load, ``step_g`` the step of the scale d,
    ``weights_density`` the weights' density with its u in kg/m³: it counts where the air is known.
    u²(E) = u²(m_c) + s²/n + 2·d²/12 + (h/2)²/3 + u_B², with n readings of the load (1 or 2), two
    roundings (zero and load), half the hysteresis h as a rectangular half-width, and
    u_B = m·|ρa − 1.2|·u(ρ)/ρ² (conventional mass, OIML D 28). The balance is zeroed before.

    Raises:
        ValueError: fewer than five repeated readings, or indications that do not rise.
    """
    if len(repeated_g) < 5:
        says = "The repeatability needs at least 5 readings of one load; 10 are advised."
        raise ValueError(says)
    s = standard_deviation(repeated_g) or 0.0
    dof = len(repeated_g) - 1
    if not all(a.indication_g < b.indication_g for a, b in pairwise(weights)):
        says = "The loads must rise from one weight to the next."
        raise ValueError(says)
    air = CONVENTIONAL_AIR if air_kg_m3 is None else air_kg_m3
    density, u_density = weights_density
    per_gram = abs(air - CONVENTIONAL_AIR) * u_density / density**2
    errors = tuple(_error(one, s=s, dof=dof, step_g=step_g, u_per_gram=per_gram) for one in weights)
    worst = max(errors, key=lambda one: one.u_g)
    hysteresis = max((abs(one.hysteresis_g or 0.0) for one in errors), default=0.0)
    bend = bend_between([(0.0, 0.0), *((one.indication_g, one.correction_g) for one in errors)])
    return WeighingCalibration(
        errors=errors,
        s_g=s,
        s_dof=dof,
        largest_hysteresis_g=hysteresis,
        interpolation_g=bend,
        error_u_g=worst.u_g,
        error_u_dof=worst.dof,
        linearity_g=0.5 * step_g + 0.5 * hysteresis + bend,
    )


def _error(
    one: WeightReading, *, s: float, dof: int, step_g: float, u_per_gram: float
) -> ErrorAtLoad:
    hysteresis = None if one.down_g is None else one.up_g - one.down_g
    readings = 1 if one.down_g is None else 2
    of_spread = s / math.sqrt(readings)
    squares = (
        one.u_g**2
        + of_spread**2
        + 2.0 * step_g**2 / 12.0
        + (0.5 * (hysteresis or 0.0)) ** 2 / 3.0
        + (one.conventional_g * u_per_gram) ** 2
    )
    error = one.indication_g - one.conventional_g
    return ErrorAtLoad(
        indication_g=one.indication_g,
        error_g=error,
        correction_g=-error,
        hysteresis_g=hysteresis,
        u_g=math.sqrt(squares),
        dof=None if of_spread == 0 else dof * squares**2 / of_spread**4,
    )


def largest_eccentricity(centre_g: float, positions_g: Sequence[float]) -> float:
    """Return the largest |reading off centre − reading in the centre| of one load, in g."""
    return max(abs(one - centre_g) for one in positions_g)


def minimum_mass(s_g: float, step_g: float) -> float:
    """Return the smallest net mass in g by USP <41>: 2000 · max(s, 0.41 d), for 0.10 %."""
    return USP_41_FACTOR * max(s_g, USP_41_LEAST_S * step_g)


@dataclass(frozen=True, slots=True)
class ChartLimits:
    """A check weight's chart in g: the centre, and how far off it warns and stops."""

    centre_g: float
    warning_g: float
    action_g: float
    basis: str


def chart_limits(readings_g: Sequence[float], *, step_g: float) -> ChartLimits:
    """Return warning at 2 s and action at 3 s about the mean of first readings (Shewhart).

    Neither is less than one step of the scale: a reading cannot show less.

    Raises:
        ValueError: fewer than five readings.
    """
    if len(readings_g) < 5:
        says = "A chart needs at least 5 readings of the check weight; 20 make it reliable."
        raise ValueError(says)
    s = standard_deviation(readings_g) or 0.0
    return ChartLimits(
        centre_g=mean_of(readings_g),
        warning_g=max(2.0 * s, step_g),
        action_g=max(3.0 * s, step_g),
        basis=f"mean and s of {len(readings_g)} readings: warning at 2 s, action at 3 s",
    )
