"""What is known beside a curve's points: system, flask, amount, temperature, scatter."""

from dataclasses import dataclass
from math import isfinite

from server.chemistry.equilibria import (
    AIR_SATURATED_CO2_MMOL_PER_ML,
    HIGHEST_C,
    LOWEST_C,
)
from server.curves.model.scatter import Given, Priors
from server.curves.model.systems import SYSTEMS, AcidBaseSystem
from server.curves.points import CurveProblem


@dataclass(frozen=True, slots=True)
class Circumstances:
    """What is known of a titration beside its points.

    ``system`` is None where no acid-base system is named; volumes in mL, amounts in mmol.
    ``volume_u_mL`` and ``reading_u`` (pH) are standard uncertainties of one point where they are
    known. ``flask_carbonate_mmol`` is carbonate in the flask's water with its u; where u is not
    given, water may hold anything from none to what laboratory air gives it.
    """

    system: AcidBaseSystem | None = None
    flask_volume_mL: float | None = None
    amount_mmol: float | None = None
    temperature_C: float = 25.0
    volume_u_mL: float | None = None
    reading_u: float | None = None
    flask_carbonate_mmol: float = 0.0
    u_flask_carbonate_mmol: float | None = None

    def __post_init__(self) -> None:
        for name in ("flask_volume_mL", "amount_mmol", "volume_u_mL", "reading_u"):
            value = getattr(self, name)
            if value is not None and not (isfinite(value) and value > 0):
                raise CurveProblem(f"{name} must be above zero, not {value:g}.", field=name)
        if not LOWEST_C <= self.temperature_C <= HIGHEST_C:
            says = (
                f"temperature_C must lie between {LOWEST_C:g} and {HIGHEST_C:g}, not at "
                f"{self.temperature_C:g}."
            )
            raise CurveProblem(says, field="temperature_C")

    def given(self) -> Given:
        """Return what a fit is given by these circumstances."""
        u_carbonate = self.u_flask_carbonate_mmol
        if u_carbonate is None:
            u_carbonate = AIR_SATURATED_CO2_MMOL_PER_ML * (self.flask_volume_mL or 50.0) / 2
        priors = Priors(
            flask_carbonate=self.flask_carbonate_mmol,
            u_flask_carbonate=max(u_carbonate, 1e-9),
        )
        return Given(priors=priors, reading_u=self.reading_u, volume_u=self.volume_u_mL)


def system_named(name: str | None) -> AcidBaseSystem | None:
    """Return an acid-base system by name; None for ``none`` or no name.

    Raises:
        CurveProblem: there is none of that name.
    """
    if name is None or name == "none":
        return None
    if name not in SYSTEMS:
        known = ", ".join([*SYSTEMS, "none"])
        raise CurveProblem(f"No system {name!r} is known; there are: {known}.", field="system")
    return SYSTEMS[name]
