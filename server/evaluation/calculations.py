"""Which calculations there are, by name and version: a snapshot asks for the one it was made by."""

from types import MappingProxyType, ModuleType

from server.evaluation.methods import standardization_v1

CURRENT: ModuleType = standardization_v1
CALCULATIONS = MappingProxyType({(one.NAME, one.VERSION): one for one in (standardization_v1,)})


class UnknownCalculation(Exception):
    """A snapshot names a calculation that this program does not have."""


def calculation(name: str, version: int) -> ModuleType:
    """Return a calculation by name and version.

    Raises:
        UnknownCalculation: there is none of that name and version.
    """
    try:
        return CALCULATIONS[(name, version)]
    except KeyError:
        known = ", ".join(f"{one} {number}" for one, number in CALCULATIONS)
        says = f"There is no calculation {name!r}, version {version}; there are: {known}."
        raise UnknownCalculation(says) from None
