"""What only the routes ``back`` and ``mass-titre`` hold in a bench record."""

from dataclasses import dataclass
from fractions import Fraction

from server.evaluation.record_fields import Fields, value_of
from server.evaluation.reference_fields import (
    REFERENCE_KEYS,
    Reference,
    glass_expansion,
    reference_of,
)
from server.metrology.quantity import Quantity

_ADDED_EXAMPLE = (
    '{"substance": "HCl", "concentration": {"value": "0.1", ...}, "delivery": {"value": "25.00", '
    '"unit": "mL"}}'
)


@dataclass(frozen=True, slots=True)
class Dose:
    """The known excess: a titrant of known concentration, and the mL at 20 °C that are added."""

    reference: Reference
    delivery: Quantity
    glass_expansion: float
    temperature: float | None


@dataclass(frozen=True, slots=True)
class Back:
    """How the excess is reckoned in a back titration.

    ``excess_to`` is ``standard`` (the titrant itself is added in excess to the weighed standard)
    or ``unknown`` (another titrant is added in excess to the pipetted titrant). ``ratio`` is the
    amount of what was added per amount of reference. ``dose`` is there where the excess is known
    by concentration and volume; without one the blank sets the zero.
    """

    excess_to: str
    ratio: Fraction | None
    substance: str | None
    dose: Dose | None


@dataclass(frozen=True, slots=True)
class Drift:
    """What gets in while one titrates: rate in µg/min, and the error of the minutes in min."""

    rate: Quantity
    timing: Quantity | None


def read_back(top: Fields, route: str) -> Back | None:
    """Return how a back titration reckons its excess, None on every other route.

    Raises:
        RecordProblem: the key on another route, or a known excess that is not whole.
    """
    if route != "back":
        _refuse_elsewhere(top, "back", "back")
        return None
    top.need("back", '{"excess_to": "standard"}')
    fields = Fields(top.document["back"], "back", ("excess_to", "ratio", "added"))
    excess_to = fields.choice("excess_to", ("standard", "unknown"))
    if excess_to == "standard" and fields.has("added"):
        says = "Added to the standard, the excess is the titrant itself: its pipette is enough."
        fields.refuse("added", says, '"pipette": {"delivery": {"value": "50.00", "unit": "mL"}}')
    ratio = fields.ratio("ratio")
    if not fields.has("added"):
        return Back(excess_to, ratio, None, None)
    added = Fields(
        fields.document["added"],
        "back.added",
        (*REFERENCE_KEYS, "delivery", "glass_expansion", "temperature"),
    )
    substance = added.text("substance", '"HCl"', required=False)
    return Back(excess_to, ratio, substance, _dose(added))


def _dose(added: Fields) -> Dose | None:
    """Return the known excess; only its substance may stand alone, where a blank sets the zero."""
    if not set(added.document) - {"substance"}:
        return None
    return Dose(
        reference=reference_of(added),
        delivery=added.need_quantity("delivery", "mL"),
        glass_expansion=glass_expansion(added),
        temperature=added.decimal("temperature", "20.0"),
    )


def check_back(top: Fields, back: Back, blank_kind: str | None) -> None:
    """Refuse a back titration whose zero is set twice, by nothing, or by what cannot set it.

    Raises:
        RecordProblem: the blank or the added excess does not go with the other keys.
    """
    zero = blank_kind == "zero"
    if back.excess_to == "standard" and zero:
        says = (
            "A blank of the excess alone would give the titrant's concentration without any "
            "standard. State what the reagents use, as a reagent blank."
        )
        top.refuse("blank.kind", says, "reagent")
    if back.excess_to == "unknown" and zero == (back.dose is not None):
        says = (
            "Both a known excess and a blank that sets the zero are stated; keep one."
            if zero
            else "State the known excess, or a blank of the kind zero: what the excess alone takes."
        )
        top.refuse("back.added", says, _ADDED_EXAMPLE)
    if zero and top.has("excess"):
        says = "The zero was titrated to the same end point: its excess cancels. Leave it out."
        top.refuse("excess", says)


def read_drift(top: Fields, route: str) -> Drift | None:
    """Return the drift of a mass titre, None where none is stated.

    Raises:
        RecordProblem: the key on another route, or a rate below zero.
    """
    if route != "mass-titre":
        _refuse_elsewhere(top, "drift", "mass-titre")
        return None
    if not top.has("drift"):
        return None
    fields = Fields(top.document["drift"], "drift", ("rate", "timing"))
    example = '{"value": "12.5", "unit": "ug/min", "u": "1.5"}'
    fields.need("rate", example)
    rate = fields.quantity("rate", "ug/min")
    if rate is None or value_of(rate) < 0:
        fields.refuse("rate.value", "A drift cannot be negative.", '"12.5"')
    return Drift(rate=rate, timing=fields.bound("timing", "min"))


def read_analyte(top: Fields, route: str) -> str | None:
    """Return the substance whose mg a mass titre counts, None on every other route.

    Raises:
        RecordProblem: the key on another route, missing, or a ratio beside it.
    """
    if route != "mass-titre":
        _refuse_elsewhere(top, "titre_of", "mass-titre")
        return None
    if top.has("ratio"):
        says = "A mass titre counts mg, not amounts: no ratio enters. Leave it out."
        top.refuse("ratio", says)
    return top.text("titre_of", '"H2O"')


def _refuse_elsewhere(top: Fields, key: str, route: str) -> None:
    if top.has(key):
        top.refuse(key, f'Only the route "{route}" takes this.')
