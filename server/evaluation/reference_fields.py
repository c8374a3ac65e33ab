"""A titrant of known concentration in a bench record, with the roots its certificate brings."""

from dataclasses import dataclass
from typing import Any

from server.evaluation.record_fields import Fields
from server.metrology.quantity import Quantity

#: What an object that names a titrant of known concentration may hold.
REFERENCE_KEYS = ("substance", "concentration", "certificate", "components")


@dataclass(frozen=True, slots=True)
class Component:
    """One root of a reference's uncertainty: its relative share, signed."""

    id: str
    relative: float


@dataclass(frozen=True, slots=True)
class Reference:
    """The in-date titrant used as standard, with the roots that its certificate brings."""

    substance: str | None
    concentration: Quantity
    certificate: str | None
    components: tuple[Component, ...]


def reference_of(fields: Fields) -> Reference:
    """Return the titrant of known concentration, mol/L at 20 °C, that an object states.

    Raises:
        RecordProblem: no concentration above zero, or components that are none.
    """
    concentration = fields.need_quantity("concentration", "mol/L")
    return Reference(
        substance=fields.text("substance", '"NaOH"', required=False),
        concentration=concentration,
        certificate=fields.text("certificate", '"TL-2026-0001"', required=False),
        components=_components(fields),
    )


def _components(fields: Fields) -> tuple[Component, ...]:
    rows, example = (
        fields.document.get("components") or (),
        '[{"id": "B-3", "relative": "-0.0006"}]',
    )
    if not isinstance(rows, list | tuple):
        fields.refuse("components", "This must be a list of components.", example)
    return tuple(_component(row, f"{fields.at('components')}[{i}]") for i, row in enumerate(rows))


def _component(row: Any, path: str) -> Component:
    fields = Fields(row, path, ("id", "relative"))
    relative = fields.need("relative", '"-0.0006"')
    if isinstance(relative, int | float) and not isinstance(relative, bool):
        # computed by an earlier evaluation, so it may travel as a number
        return Component(id=str(fields.text("id", '"B-3"')), relative=float(relative))
    value = fields.decimal("relative", "-0.0006")
    return Component(id=str(fields.text("id", '"B-3"')), relative=value or 0.0)


def glass_expansion(fields: Fields) -> float:
    """Return a cubic expansion of glass per K; 0 where it is absent."""
    value = fields.decimal("glass_expansion", "9.9e-6") or 0.0
    if not 0.0 <= value < 1e-3:
        says = "A cubic expansion of glass lies between 0 and 0.001 per K."
        fields.refuse("glass_expansion", says, '"9.9e-6"')
    return value
