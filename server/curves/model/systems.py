"""Acid-base systems that the model fit knows: a weak acid or base with a strong titrant."""

from dataclasses import dataclass
from types import MappingProxyType
from typing import Literal

from server.chemistry.equilibria import CARBONIC, PHTHALIC, TRIS, AcidConstant

_ACTIVITY_MODEL_U = 0.03
"""What Davies' equation and the glass electrode leave open in a conditional pK, as u."""


@dataclass(frozen=True, slots=True)
class AcidBaseSystem:
    """What stands in the flask and what comes from the burette.

    ``top_charge`` is the charge of the analyte's most protonated species, ``strong_charge`` the
    strong cations (less strong anions) that come with one of it, ``protons`` how many of its
    protons the titrant gives or takes up to the last equivalence point, ``fitted_steps`` the
    positions in ``analyte`` whose pK is fitted within a prior of ``u_pK``.
    """

    name: str
    says: str
    titrant: Literal["base", "acid"]
    analyte: tuple[AcidConstant, ...]
    top_charge: int
    strong_charge: int
    protons: int
    fitted_steps: tuple[int, ...]
    u_pK: float = _ACTIVITY_MODEL_U
    inner_step: float | None = None
    """Where an earlier equivalence point lies, as a fraction of the last; None: there is none."""

    @property
    def sign(self) -> int:
        """Charge of the titrant's strong ion: +1 with a base, -1 with an acid."""
        return 1 if self.titrant == "base" else -1

    @property
    def direction(self) -> str:
        """Where the pH goes."""
        return "rising" if self.titrant == "base" else "falling"

    @property
    def takes_up_carbonate(self) -> bool:
        """Whether carbonate in titrant and flask water is part of the model."""
        return self.titrant == "base"


SYSTEMS = MappingProxyType(
    {
        one.name: one
        for one in (
            AcidBaseSystem(
                name="khp-naoh",
                says="potassium hydrogen phthalate with sodium hydroxide",
                titrant="base",
                analyte=PHTHALIC,
                top_charge=0,
                strong_charge=1,
                protons=1,
                fitted_steps=(1,),
            ),
            AcidBaseSystem(
                name="tris-hcl",
                says="TRIS with hydrochloric acid",
                titrant="acid",
                analyte=TRIS,
                top_charge=1,
                strong_charge=0,
                protons=1,
                fitted_steps=(0,),
            ),
            AcidBaseSystem(
                name="carbonate-hcl",
                says="sodium carbonate with hydrochloric acid, two steps",
                titrant="acid",
                analyte=CARBONIC,
                top_charge=0,
                strong_charge=2,
                protons=2,
                fitted_steps=(0, 1),
                inner_step=0.5,
            ),
        )
    }
)
SYSTEM_NAMES = (*SYSTEMS, "none")
