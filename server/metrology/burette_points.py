"""A burette weighed at several points of its scale: curve of errors and what it gives for use."""

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from server.metrology.error_curve import bend_between
from server.metrology.gravimetry import Run, Ware, WaterWeighing, evaluate_run, weighed_volume
from server.metrology.propagation import Input
from server.metrology.type_a import pooled


@dataclass(frozen=True, slots=True)
class PointOfScale:
    """One reading of the scale, delivered from the zero mark: what to add to it, with u, in mL."""

    reading_mL: float
    correction_mL: float
    u_mL: float
    dof: float | None
    run: Run


@dataclass(frozen=True, slots=True)
class CurveOfErrors:
    """The points in rising order, and what one delivered volume is uncertain by, in mL.

    ``pooled_s_mL`` is the repeatability of one delivery from all points, with its dof;
    ``interpolation_mL`` the half-width (rectangular) of going straight between points;
    ``largest_mL`` the largest |correction|, ``largest_between_mL`` the largest difference between
    the corrections of any two points, the zero mark included.
    """

    points: tuple[PointOfScale, ...]
    pooled_s_mL: float
    pooled_dof: float
    interpolation_mL: float
    delivery_u_mL: float
    delivery_dof: float | None
    largest_mL: float
    largest_between_mL: float

    @property
    def error_table(self) -> tuple[tuple[float, float], ...]:
        """Readings and what is added to them, from the zero mark on."""
        return ((0.0, 0.0), *((one.reading_mL, one.correction_mL) for one in self.points))


def evaluate_points(
    points: Mapping[float, Sequence[WaterWeighing]], ware: Ware, *, errors: Sequence[Input] = ()
) -> CurveOfErrors:
    """Return the curve of errors of a burette from weighings by reading in mL.

    Every delivery starts at the zero mark. The repeatability is pooled over the points, so that a
    point may be weighed once where others are weighed more often. The u of one delivery is that of
    the worst point, with the half-width of the interpolation.

    Raises:
        ValueError: fewer than two points, a reading that is not above zero, no point weighed twice.
    """
    readings = sorted(points)
    if len(readings) < 2 or readings[0] <= 0:
        says = "A curve of errors needs at least two readings above the zero mark."
        raise ValueError(says)
    volumes = [[weighed_volume(one, ware).volume_mL for one in points[at]] for at in readings]
    spread = pooled(volumes)
    if spread is None:
        says = "No point was weighed twice: nothing tells the repeatability of a delivery."
        raise ValueError(says)
    s, dof = spread[0], float(spread[1])
    found = tuple(
        _point(
            at,
            evaluate_run(points[at], ware, nominal_mL=at, errors=errors, repeatability=(s, dof)),
        )
        for at in readings
    )
    return _curve(found, s, dof)


def _point(reading: float, run: Run) -> PointOfScale:
    return PointOfScale(reading, run.systematic_mL, run.u_mL, run.dof, run)


def _curve(points: tuple[PointOfScale, ...], s: float, dof: float) -> CurveOfErrors:
    corrections = [0.0, *(one.correction_mL for one in points)]
    worst = max(points, key=lambda one: one.u_mL)
    bend = bend_between([(0.0, 0.0), *((one.reading_mL, one.correction_mL) for one in points)])
    u = math.hypot(worst.u_mL, bend / math.sqrt(3.0))
    # the interpolation has no degrees of freedom of its own: it is a bound
    left = None if worst.dof is None else worst.dof * (u / worst.u_mL) ** 4
    return CurveOfErrors(
        points=points,
        pooled_s_mL=s,
        pooled_dof=dof,
        interpolation_mL=bend,
        delivery_u_mL=u,
        delivery_dof=left,
        largest_mL=max(abs(one) for one in corrections),
        largest_between_mL=max(corrections) - min(corrections),
    )
